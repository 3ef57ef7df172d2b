/** Growth of a wake's radius with distance, no unit: 0.05 to 0.075 are common on land. */
const EXPANSION = 0.06

/**
 * Speed deficit behind one turbine, as a share of the wind in front of it: on the axis that of a top-hat wake which
 * grows linearly, (1 - sqrt(1 - CT)) / (1 + k x / R)^2; across it a Gaussian of the same area instead of the top hat,
 * so that nothing jumps when the direction turns.
 *
 * @param downstreamM distance behind the rotor, m; 0 in front of it gives 0
 * @param acrossM distance from the axis, m
 * @param thrust CT, 0 to 1
 * @source N. O. Jensen (1983), A note on wind generator interaction, Riso-M-2411, for the top-hat wake
 */
export function wakeDeficit(
  downstreamM: number,
  acrossM: number,
  rotorDiameterM: number,
  thrust: number,
): number {
  if (!(downstreamM > 0)) return 0
  const radius = rotorDiameterM / 2
  const growth = 1 + (EXPANSION * downstreamM) / radius
  const wakeRadius = radius * growth
  const arm = acrossM / wakeRadius
  if (arm > 4 || arm < -4) return 0
  return ((1 - Math.sqrt(1 - thrust)) / (growth * growth)) * Math.exp(-arm * arm)
}

/** Thrust coefficient at a wind speed in m/s: 0.8 up to 9 m/s, then falling with the cube; 0 outside 3 to 25. */
export function thrustAt(speedMs: number): number {
  if (!(speedMs >= 3 && speedMs <= 25)) return 0
  return speedMs <= 9 ? 0.8 : 0.8 * (9 / speedMs) ** 3
}
