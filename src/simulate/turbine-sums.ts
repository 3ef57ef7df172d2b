/** Sums of single seconds over the window; `clear`: running, started up, no set-point below rated. */
export interface TurbineSums {
  producedMwh: number
  clearHours: number
  clearMwh: number
  /** Energy not made in clear seconds because of the standing yaw error d / k, MWh: power at g - d/k less power at g. */
  lostStaticMwh: number
  /** ... because of the rest: power at yaw error 0 less power at g - d/k. */
  lostDynamicMwh: number
  /** Clear seconds below 95 % of rated power: hours, mean true yaw error, its standard deviation, mean of the logged vane. */
  belowRatedHours: number
  yawErrorMeanDeg: number
  yawErrorSdDeg: number
  vaneMeanDeg: number
  /** Yaw moves begun, untwisting not counted, and degrees travelled. */
  yawMoves: number
  yawTravelDeg: number
}

const MWH_PER_KWS = 1 / 3.6e6

/** The seconds' sums as they grow, kW s and degrees. */
export class SecondSums {
  produced = 0
  clearS = 0
  clear = 0
  lostStatic = 0
  lostDynamic = 0
  belowS = 0
  belowError = 0
  belowErrorSquares = 0
  belowVane = 0

  addBelowRated(errorDeg: number, vaneDeg: number): void {
    this.belowS++
    this.belowError += errorDeg
    this.belowErrorSquares += errorDeg * errorDeg
    this.belowVane += vaneDeg
  }

  /** Means are NaN where no second was below rated. */
  finished(yawMoves: number, yawTravelDeg: number): TurbineSums {
    const yawErrorMeanDeg = this.belowError / this.belowS
    return {
      producedMwh: this.produced * MWH_PER_KWS,
      clearHours: this.clearS / 3600,
      clearMwh: this.clear * MWH_PER_KWS,
      lostStaticMwh: this.lostStatic * MWH_PER_KWS,
      lostDynamicMwh: this.lostDynamic * MWH_PER_KWS,
      belowRatedHours: this.belowS / 3600,
      yawErrorMeanDeg,
      yawErrorSdDeg: Math.sqrt(Math.max(0, this.belowErrorSquares / this.belowS - yawErrorMeanDeg ** 2)),
      vaneMeanDeg: this.belowVane / this.belowS,
      yawMoves,
      yawTravelDeg,
    }
  }
}
