/** Runs pieces of work one after the other, in the order in which they were handed in. */
export class SerialQueue {
  private tail: Promise<unknown> = Promise.resolve()

  add<T>(work: () => T | Promise<T>): Promise<T> {
    const result = this.tail.then(work)
    this.tail = result.then(ignore, ignore)
    return result
  }

  idle(): Promise<unknown> {
    return this.tail
  }
}

function ignore(): void {
  // whoever handed the work in sees its failure; the next piece starts all the same
}
