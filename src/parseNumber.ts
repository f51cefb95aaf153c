/**
 * A number as people type it: decimal comma or point, any minus sign, spaces around it. null when it is not one.
 * '1.234,5' and '1,234.5' are refused: which of the two signs is the decimal one would be a guess.
 */
export function parseNumber(text: string): number | null {
  const plain = text
    .trim()
    .replace(/\u2212/g, '-')
    .replace(',', '.')
  if (!/^[+-]?(?:\d+\.?\d*|\.\d+)$/.test(plain)) return null
  return Number(plain)
}
