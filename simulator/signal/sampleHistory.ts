/** The last samples of one channel, found again by their number. */
export class SampleHistory {
  private readonly ring: Float64Array
  private next = 0

  constructor(length: number) {
    this.ring = new Float64Array(length)
  }

  push(samples: Float64Array, count: number): void {
    const length = this.ring.length
    for (let i = 0; i < count; i++) this.ring[(this.next + i) % length] = samples[i]!
    this.next += count
  }

  /** Samples from..from+count; null if they are not all here (any more). */
  read(from: number, count: number): Float64Array | null {
    const length = this.ring.length
    if (from < 0 || count > length || from + count > this.next || from < this.next - length) return null
    const at = from % length
    if (at + count <= length) return this.ring.slice(at, at + count)
    const out = new Float64Array(count)
    out.set(this.ring.subarray(at))
    out.set(this.ring.subarray(0, at + count - length), length - at)
    return out
  }
}
