declare module 'jstat' {
  interface Continuous<P extends unknown[]> {
    pdf(x: number, ...parameters: P): number
    cdf(x: number, ...parameters: P): number
    inv(p: number, ...parameters: P): number
  }
  const jStat: {
    gammaln(x: number): number
    normal: Continuous<[mean: number, sd: number]>
    studentt: Continuous<[dof: number]>
  }
  export default jStat
}
