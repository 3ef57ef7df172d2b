declare module 'jstat' {
  const jstat: {
    jStat: {
      studentt: { inv(probability: number, degreesOfFreedom: number): number }
      erfc(x: number): number
      lowRegGamma(a: number, x: number): number
    }
  }
  export default jstat
}
