/** A serial as it is searched: what people mistake for one another (O and 0, I and 1) is the same, gaps are none. */
export function foldedSerial(text: string): string {
  return text
    .toUpperCase()
    .replace(/[^A-Z0-9]/g, '')
    .replaceAll('O', '0')
    .replaceAll('I', '1')
}
