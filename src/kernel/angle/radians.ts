/** Radians in one degree. */
export const RAD_PER_DEG = Math.PI / 180

/** Degrees in one radian. */
export const DEG_PER_RAD = 180 / Math.PI
