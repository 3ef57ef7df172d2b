export {
  codeAngles,
  potentiometerAngles,
  type AngleScale,
  type CodeScale,
  type DecodedAngles,
} from './code-angles.ts'
export { binaryFromGray, codeStepDeg, grayFromBinary } from './gray-code.ts'
export {
  countsPerTurn,
  degPerCount,
  PulseCounter,
  type IndexError,
  type PulseCounts,
  type PulseLevels,
  type PulseScale,
} from './pulse-counter.ts'
export {
  pathSoundMs,
  pathSpeedMs,
  sonicTemperatureC,
  ultrasonicWind,
  type UltrasonicScale,
  type UltrasonicWind,
} from './ultrasonic.ts'
