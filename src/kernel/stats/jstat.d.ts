declare module 'jstat' {
  const jstat: { jStat: { studentt: { inv(probability: number, degreesOfFreedom: number): number } } }
  export default jstat
}
