import type { Inflow } from './inflow.ts'
import { STOP, type Orders } from './operation.ts'
import { COS_POWER_PER_DEG, cosPowerTable, powerTable, speedAtPower } from './power-curve.ts'
import { PURPOSE, RandomStream } from './random.ts'
import { BLOCK_S, RowMaker, Seconds, STATE, type TurbineRows } from './rows.ts'
import { changesOf, scenarioSeconds, type FarmScenario, type TurbinePlan } from './scenario.ts'
import { Reverting } from './weather.ts'

/** Seconds between two values of the slower processes. */
const NODE_S = 10
/** Share of the variance of turbulence on each time scale; the rotor averages the fastest away, a vane does not. */
const SHARE_5S = 0.35
const SHARE_60S = 0.4
const SHARE_600S = 0.25
/** Limits of operation, m/s of the anemometer over a minute. */
const CUT_IN_MS = 3.3
const IDLE_MS = 2.7
const STORM_MS = 25
const STORM_END_MS = 21
/** Own consumption at standstill, kW. */
const CONSUMPTION_KW = -8
/** Time constants: rotor with drive train, pitch, rotor speed, start-up. */
const ROTOR_S = 7
const PITCH_S = 5
const SPEED_S = 10
const START_S = 60
/** The anemometer's response is taken from the vane within this range: beyond it the flow has parted. */
const RESPONSE_MAX_DEG = 30
/** Cables allow so many degrees; then the turbine stops and turns back. */
const CABLE_DEG = 900

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
  /** Number of yaw moves, and degrees travelled. */
  yawMoves: number
  yawTravelDeg: number
}

/**
 * One turbine, second by second: local wind, vane, yaw controller, rotor, anemometer; fills `rows`.
 * The controller holds the mean of its vane near 0, so the true yaw error has the mean d / k: no log shows it.
 */
export function runTurbine(
  scenario: FarmScenario,
  plan: TurbinePlan,
  inflow: Inflow,
  orders: Orders,
  rows: TurbineRows,
): TurbineSums {
  const seconds = scenarioSeconds(scenario)
  const rated = scenario.ratedPowerKw
  const table = powerTable(rated, scenario.ratedWindMs)
  const curve = table.powerKw
  const perMs = table.perMs
  const curveEnd = curve.length - 2
  const cosPower = cosPowerTable(scenario.exponent)
  const maker = new RowMaker(rows, {
    rateS: scenario.rateS,
    northOffsetDeg: plan.northOffsetDeg,
    nacelleScale: scenario.nacelleScale,
    averageAcrossNorth: scenario.averageAcrossNorth,
    secondVane: scenario.secondVaneOffsetDeg !== null,
  })

  const streamOf = (purpose: number) => new RandomStream(scenario.seed, purpose, plan.index)
  const streams = [PURPOSE.gust, PURPOSE.veer, PURPOSE.vaneNoise, PURPOSE.anemometerNoise].map(streamOf)
  const [gustNoise, veerNoise, vaneNoise, windNoise] = streams.map(() => new Float64Array(BLOCK_S)) as [
    Float64Array,
    Float64Array,
    Float64Array,
    Float64Array,
  ]
  const slow = streamOf(PURPOSE.slow)
  const link = scenario.linkCorrelation
  const apart = Math.sqrt(1 - link * link)
  const speed60 = new Reverting(slow, 60 / NODE_S)
  const speed600 = new Reverting(slow, 600 / NODE_S)
  const speedHour = new Reverting(slow, 3600 / NODE_S)
  const turn60 = new Reverting(slow, 60 / NODE_S)
  const turn600 = new Reverting(slow, 600 / NODE_S)
  const turnHour = new Reverting(slow, 3600 / NODE_S)
  const vaneSlow = new Reverting(slow, 1200 / NODE_S)
  const windSlow = new Reverting(slow, 1200 / NODE_S)

  const weight5 = Math.sqrt(SHARE_5S)
  const weight60 = Math.sqrt(SHARE_60S)
  const weight600 = Math.sqrt(SHARE_600S)
  const keep5 = Math.exp(-1 / 5)
  const fresh5 = Math.sqrt(1 - keep5 * keep5)
  const keepYaw = Math.exp(-2 / scenario.yawAverageS)
  const keepStop = Math.exp(-1 / 5)
  const keepMinute = Math.exp(-1 / 30)
  const codeStep = scenario.vaneBits > 0 ? 360 / 2 ** scenario.vaneBits : 0
  const gain = scenario.vaneGain
  let loggedShift = scenario.vaneLogged === 'beforeCorrection' ? plan.correctionDeg : 0
  const changes = changesOf(scenario, plan.index)

  // Taken out of their objects once: scenarios differ in the order of their keys, and the loop below would be compiled anew.
  const { vaneNoiseDeg, vaneSlowNoiseDeg, anemometerNoiseMs, anemometerSlowError } = scenario
  const { directionSdDeg, localSpeedSd, localDirectionSdDeg, vaneLogged } = scenario
  const { yawRateDegS, yawThresholdDeg, yawHoldS, yawStopDeg } = scenario
  const { anemometerGain, responsePerDeg } = plan

  const second = scenario.secondVaneOffsetDeg
  const secondNoise = streamOf(PURPOSE.secondVane)
  const secondSlow = new Reverting(secondNoise, 1200 / NODE_S)
  const faults = scenario.faults.filter((fault) => fault.turbine === plan.index)

  let offset = plan.offsetDeg
  let nextChange = 0
  let frozen = false
  let frozenAt = NaN
  let nacelleShift = 0
  let windFactor = 1
  let limit = rated
  let limitSpeed = speedAtPower(table, 0.97 * rated)

  // Values at the end of the running ten seconds; the first second starts from them.
  let nodeWind = inflow.speedMs[0]!
  let nodeTurn = inflow.directionDeg[0]!
  let nodeVane = 0
  let nodeError = 0
  let heading = nodeTurn - 360 * Math.floor(nodeTurn / 360)
  let gust = 0
  let veer = 0
  let vaneMean = 0
  let vaneShort = 0
  let windMean = nodeWind
  let holdS = 0
  let yawing = 0
  let untwistTo = NaN
  let ramp = nodeWind > CUT_IN_MS ? 1 : 0
  let idle = ramp === 0
  let storm = false
  let power = 0
  let pitch = 0
  let rotorSpeed = 0

  const sums: TurbineSums = {
    producedMwh: 0,
    clearHours: 0,
    clearMwh: 0,
    lostStaticMwh: 0,
    lostDynamicMwh: 0,
    belowRatedHours: 0,
    yawErrorMeanDeg: 0,
    yawErrorSdDeg: 0,
    vaneMeanDeg: 0,
    yawMoves: 0,
    yawTravelDeg: 0,
  }
  let yawMoves = 0
  let yawTravel = 0
  let produced = 0,
    clearS = 0,
    clear = 0,
    lostStatic = 0,
    lostDynamic = 0
  let belowS = 0,
    belowError = 0,
    belowErrorSquares = 0,
    belowVane = 0

  const { speedMs, directionDeg, turbulence: turbulences, densityFactor: densityFactors } = inflow
  const { performance: performances } = inflow
  const { stop: stops, limitKw: limitsKw } = orders
  const block = new Seconds()
  const { windMs, vaneDeg, secondVaneDeg, headingDeg, yawing: yawingNow, powerKw, pitchDeg, rotorRpm } = block
  const { limitKw, state: states, yawErrorDeg, rotorWindMs } = block
  for (let blockS = 0; blockS < seconds; blockS += BLOCK_S) {
    streams[0]!.fillNormal(gustNoise)
    streams[1]!.fillNormal(veerNoise)
    streams[2]!.fillNormal(vaneNoise)
    streams[3]!.fillNormal(windNoise)
    for (let nodeS = 0; nodeS < BLOCK_S; nodeS += NODE_S) {
      const endS = blockS + nodeS + NODE_S
      const minute = Math.floor((endS - NODE_S) / 60)
      const part = (endS - minute * 60) / 60
      const base = speedMs[minute]! + part * (speedMs[minute + 1]! - speedMs[minute]!)
      const baseTurn = directionDeg[minute]! + part * (directionDeg[minute + 1]! - directionDeg[minute]!)
      const turbulence = turbulences[minute]!
      const densityFactor = densityFactors[minute]!
      const performance = performances[minute]!
      const turnSd = (directionSdDeg * turbulence) / 0.1
      const s60 = speed60.step()
      const s600 = speed600.step()
      const sHour = speedHour.step()
      const targetWind = Math.max(
        0.2,
        base * (1 + localSpeedSd * sHour) * (1 + turbulence * (weight60 * s60 + weight600 * s600)),
      )
      const targetTurn =
        baseTurn +
        localDirectionSdDeg * (link * sHour + apart * turnHour.step()) +
        turnSd *
          (weight60 * (link * s60 + apart * turn60.step()) +
            weight600 * (link * s600 + apart * turn600.step()))
      const targetVane = vaneSlowNoiseDeg * vaneSlow.step()
      const targetError = anemometerSlowError * windSlow.step()
      const stepWind = (targetWind - nodeWind) / NODE_S
      const stepTurn = (targetTurn - nodeTurn) / NODE_S
      const stepVane = (targetVane - nodeVane) / NODE_S
      const stepError = (targetError - nodeError) / NODE_S
      const gustSize = weight5 * turbulence
      const veerSize = weight5 * turnSd

      const stop = stops[minute]!
      if (limitsKw[minute]! !== limit) {
        limit = limitsKw[minute]!
        limitSpeed = speedAtPower(table, Math.min(limit, 0.97 * rated))
      }
      if (nextChange < changes.length && changes[nextChange]!.atS < endS) {
        // A correction that was entered is one that the vane before correction does not show.
        if (changes[nextChange]!.entered && vaneLogged === 'beforeCorrection') {
          loggedShift += offset - changes[nextChange]!.toDeg
        }
        offset = changes[nextChange]!.toDeg
        nextChange++
      }
      const standing = offset / gain
      if (faults.length > 0) {
        frozen = false
        nacelleShift = 0
        windFactor = 1
        for (const { kind, size, fromS, toS } of faults) {
          const sinceS = endS - NODE_S - fromS
          if (!(sinceS >= 0 && endS - NODE_S < toS)) continue
          if (kind === 'vane-frozen') frozen = true
          if (kind === 'nacelle-shift') nacelleShift += size
          if (kind === 'nacelle-drift') nacelleShift += (size * sinceS) / 86400
          if (kind === 'anemometer-gain') windFactor *= size
        }
        if (!frozen) frozenAt = NaN
      }
      const secondShift = second === null ? 0 : second + loggedShift - vaneSlowNoiseDeg * secondSlow.step()

      for (let i = nodeS; i < nodeS + NODE_S; i++) {
        nodeWind += stepWind
        nodeTurn += stepTurn
        nodeVane += stepVane
        nodeError += stepError
        gust = keep5 * gust + fresh5 * gustNoise[i]!
        veer = keep5 * veer + fresh5 * (link * gustNoise[i]! + apart * veerNoise[i]!)

        // Yaw error as the rotor feels it, and as the point of the vane does.
        let error = nodeTurn - heading
        error -= 360 * Math.floor((error + 180) * (1 / 360))
        const flow = gain * (error + veerSize * veer) - offset
        let vane = flow + nodeVane + vaneNoiseDeg * vaneNoise[i]!
        if (codeStep > 0) vane = Math.round(vane / codeStep) * codeStep
        vane -= 360 * Math.floor((vane + 180) * (1 / 360))
        if (frozen) {
          if (Number.isNaN(frozenAt)) frozenAt = vane
          vane = frozenAt
        }
        if (second !== null) {
          const other = flow + vaneNoiseDeg * secondNoise.normal() - secondShift
          secondVaneDeg[i] = other - 360 * Math.floor((other + 180) * (1 / 360))
        }

        const bend =
          flow > RESPONSE_MAX_DEG ? RESPONSE_MAX_DEG : flow < -RESPONSE_MAX_DEG ? -RESPONSE_MAX_DEG : flow
        let wind =
          nodeWind * (1 + gustSize * gust) * anemometerGain * (1 + responsePerDeg * bend) * (1 + nodeError) +
          anemometerNoiseMs * windNoise[i]!
        wind = wind < 0 ? 0 : wind * windFactor
        windMean = keepMinute * windMean + (1 - keepMinute) * wind

        // State.
        if (storm ? windMean < STORM_END_MS : windMean > STORM_MS) storm = !storm
        if (idle ? windMean > CUT_IN_MS : windMean < IDLE_MS) idle = !idle
        const untwisting = !Number.isNaN(untwistTo)
        const running = stop === 0 && !idle && !storm && !untwisting
        ramp = running ? (ramp < 1 ? ramp + 1 / START_S : 1) : 0

        // Yaw controller: it sees the vane and nothing else.
        vaneMean = keepYaw * vaneMean + (1 - keepYaw) * vane
        vaneShort = keepStop * vaneShort + (1 - keepStop) * vane
        if (untwisting) {
          const left = untwistTo - heading
          if (left > yawRateDegS) heading += yawRateDegS
          else if (left < -yawRateDegS) heading -= yawRateDegS
          else untwistTo = NaN
          yawing = 0
          vaneMean = vane
        } else if (yawing !== 0) {
          heading += yawing * yawRateDegS
          yawTravel += yawRateDegS
          if (vaneShort * yawing < yawStopDeg || stop === STOP.maintenance) {
            yawing = 0
            vaneMean = vaneShort
            holdS = 0
            if (heading > CABLE_DEG || heading < -CABLE_DEG) {
              untwistTo = heading - 360 * Math.round(heading / 360)
            }
          }
        } else {
          const threshold = running ? yawThresholdDeg : 2 * yawThresholdDeg
          const off = vaneMean > threshold || vaneMean < -threshold
          holdS = off ? holdS + 1 : 0
          if (holdS > yawHoldS && windMean > IDLE_MS - 0.4 && stop !== STOP.maintenance) {
            yawing = vaneMean > 0 ? 1 : -1
            yawMoves++
          }
        }

        // Power at the yaw error, at the error less its standing part, and without any.
        const effective = nodeWind * densityFactor
        let at = (error < 0 ? -error : error) * COS_POWER_PER_DEG
        let k = at | 0
        const cosError = cosPower[k]! + (at - k) * (cosPower[k + 1]! - cosPower[k]!)
        const along = effective * cosError
        at = along * perMs
        if (at > curveEnd) at = curveEnd
        k = at | 0
        let available = performance * (curve[k]! + (at - k) * (curve[k + 1]! - curve[k]!))
        if (available > rated) available = rated
        if (ramp === 1 && limit >= rated) {
          let rest = error - standing
          rest -= 360 * Math.floor((rest + 180) * (1 / 360))
          at = (rest < 0 ? -rest : rest) * COS_POWER_PER_DEG
          k = at | 0
          at = effective * (cosPower[k]! + (at - k) * (cosPower[k + 1]! - cosPower[k]!)) * perMs
          if (at > curveEnd) at = curveEnd
          k = at | 0
          let corrected = performance * (curve[k]! + (at - k) * (curve[k + 1]! - curve[k]!))
          if (corrected > rated) corrected = rated
          at = effective * perMs
          if (at > curveEnd) at = curveEnd
          k = at | 0
          let faced = performance * (curve[k]! + (at - k) * (curve[k + 1]! - curve[k]!))
          if (faced > rated) faced = rated
          clearS++
          clear += available
          lostStatic += corrected - available
          lostDynamic += faced - corrected
          if (available < 0.95 * rated) {
            belowS++
            belowError += error
            belowErrorSquares += error * error
            belowVane += vane - loggedShift
          }
        }

        const allowed = available < limit ? available : limit
        const targetPower = running ? allowed * ramp + CONSUMPTION_KW * (1 - ramp) : CONSUMPTION_KW
        power += (targetPower - power) * (1 / ROTOR_S)
        if (power > 0) produced += power
        const excess = along - limitSpeed
        const targetPitch = running
          ? excess > 0
            ? (6 * excess) / (1 + 0.15 * excess)
            : 0
          : stop !== 0
            ? 88
            : 60
        pitch += (targetPitch - pitch) * (1 / PITCH_S)
        let targetSpeed = 0.3
        if (running) {
          const tip = 1.47 * along
          targetSpeed = ramp * (tip > 14.6 ? 14.6 : tip < 7 ? 7 : tip)
        } else if (stop !== 0) targetSpeed = 0
        rotorSpeed += (targetSpeed - rotorSpeed) * (1 / SPEED_S)

        let logged = vane - loggedShift
        if (loggedShift !== 0) logged -= 360 * Math.floor((logged + 180) / 360)
        const state = running
          ? limit < rated
            ? STATE.limited
            : STATE.run
          : stop !== 0
            ? STATE.stop
            : untwisting
              ? STATE.untwist
              : storm
                ? STATE.storm
                : STATE.idle
        const moving = yawing !== 0 || untwisting ? 1 : 0
        windMs[i] = wind
        vaneDeg[i] = logged
        headingDeg[i] = heading + nacelleShift
        yawingNow[i] = moving
        powerKw[i] = power
        pitchDeg[i] = pitch
        rotorRpm[i] = rotorSpeed
        limitKw[i] = limit
        states[i] = state
        yawErrorDeg[i] = error
        rotorWindMs[i] = nodeWind
      }
    }
    maker.addBlock(block)
  }

  const mwhPerKws = 1 / 3.6e6
  sums.yawMoves = yawMoves
  sums.yawTravelDeg = yawTravel
  sums.producedMwh = produced * mwhPerKws
  sums.clearHours = clearS / 3600
  sums.clearMwh = clear * mwhPerKws
  sums.lostStaticMwh = lostStatic * mwhPerKws
  sums.lostDynamicMwh = lostDynamic * mwhPerKws
  sums.belowRatedHours = belowS / 3600
  if (belowS > 0) {
    sums.yawErrorMeanDeg = belowError / belowS
    sums.yawErrorSdDeg = Math.sqrt(Math.max(0, belowErrorSquares / belowS - sums.yawErrorMeanDeg ** 2))
    sums.vaneMeanDeg = belowVane / belowS
  } else {
    sums.yawErrorMeanDeg = sums.yawErrorSdDeg = sums.vaneMeanDeg = NaN
  }
  return sums
}
