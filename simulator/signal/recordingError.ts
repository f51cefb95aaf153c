/** A recording or a stream of samples that cannot be measured; the message says what is wrong and what to do. */
export class RecordingError extends Error {
  override name = 'RecordingError'
}
