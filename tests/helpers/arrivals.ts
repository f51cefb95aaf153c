/** Things that arrive one after another: a test takes them in order and waits for what is not there yet. */
export interface Arrivals<T> {
  push(item: T): void
  take(): Promise<T>
  /** takes until one fits, letting the others go */
  takeUntil(fits: (item: T) => boolean): Promise<T>
  /** how many arrived and were not taken */
  count(): number
}

export function makeArrivals<T>(): Arrivals<T> {
  const items: T[] = []
  const waiting: ((item: T) => void)[] = []
  const take = (): Promise<T> => {
    const item = items.shift()
    if (item !== undefined) return Promise.resolve(item)
    return new Promise((resolve) => waiting.push(resolve))
  }
  return {
    push(item) {
      const resolve = waiting.shift()
      if (resolve) resolve(item)
      else items.push(item)
    },
    take,
    async takeUntil(fits) {
      for (;;) {
        const item = await take()
        if (fits(item)) return item
      }
    },
    count: () => items.length,
  }
}
