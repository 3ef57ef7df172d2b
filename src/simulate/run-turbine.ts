import type { Inflow } from './inflow.ts'
import { AnemometerFaults } from './anemometer-faults.ts'
import { faultsOf } from './faults.ts'
import { NacelleFaults, type NacelleStep } from './nacelle-faults.ts'
import type { Orders } from './operation.ts'
import { COS_POWER_PER_DEG, cosPowerTable, powerTable, speedAtPower } from './power-curve.ts'
import { PURPOSE, RandomStream } from './random.ts'
import { BLOCK_S, RowMaker, Seconds, STATE, type TurbineRows } from './rows.ts'
import { scenarioSeconds, type FarmScenario } from './scenario.ts'
import { offsetSteps, type TurbinePlan } from './turbine-plan.ts'
import { SecondSums, type TurbineSums } from './turbine-sums.ts'
import { VaneFaults } from './vane-faults.ts'
import { Reverting } from './weather.ts'
import { behaviourChanges, yawBehaviour } from './yaw-behaviour.ts'
import { YawController } from './yaw-controller.ts'

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
/** Tracks of an encoder disc where the scenario names none. */
const USUAL_BITS = 8
/** The anemometer's response is taken from the vane within this range: beyond it the flow has parted. */
const RESPONSE_MAX_DEG = 30
/** A turbine's time: its sums, and when the error of its nacelle position took another value of its own accord. */
export interface TurbineRun {
  sums: TurbineSums
  nacelleSteps: readonly NacelleStep[]
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
): TurbineRun {
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
  const keepMinute = Math.exp(-1 / 30)
  const faults = faultsOf(scenario.faults, plan.index)
  const faulty = faults.length > 0
  const bits =
    scenario.vaneBits > 0
      ? scenario.vaneBits
      : faults.some(({ kind }) => kind === 'vane-stuck-bit')
        ? USUAL_BITS
        : 0
  const codeStep = bits > 0 ? 360 / 2 ** bits : 0
  const gain = scenario.vaneGain
  let loggedShift = scenario.vaneLogged === 'beforeCorrection' ? plan.correctionDeg : 0
  const changes = offsetSteps(scenario, plan)

  // Taken out of their objects once: scenarios differ in the order of their keys, and the loop below would be compiled anew.
  const { vaneNoiseDeg, vaneSlowNoiseDeg, anemometerNoiseMs, anemometerSlowError } = scenario
  const { directionSdDeg, localSpeedSd, localDirectionSdDeg, vaneLogged } = scenario
  const { anemometerGain, responsePerDeg } = plan
  const { anemometerResponseSquarePerDeg2: square, anemometerResponseCubePerDeg3: cube } = scenario

  const second = scenario.secondVaneOffsetDeg
  const secondNoise = streamOf(PURPOSE.secondVane)
  const secondSlow = new Reverting(secondNoise, 1200 / NODE_S)

  const vaneFaults = new VaneFaults(faults, streamOf(PURPOSE.vaneFault), NODE_S, bits)
  const nacelleFaults = new NacelleFaults(faults, streamOf(PURPOSE.nacelleFault), NODE_S)
  const anemometerFaults = new AnemometerFaults(faults)
  const behaviourChangesS = behaviourChanges(faults)

  let offset = plan.offsetDeg
  let nextChange = 0
  let limit = rated
  let limitSpeed = speedAtPower(table, 0.97 * rated)

  // Values at the end of the running ten seconds; the first second starts from them.
  let nodeWind = inflow.speedMs[0]!
  let nodeTurn = inflow.directionDeg[0]!
  let nodeVane = 0
  let nodeError = 0
  const twist = 360 * Math.round(faults.find(({ kind }) => kind === 'yaw-no-untwist')?.size ?? 0)
  const controller = new YawController(
    yawBehaviour(scenario, faults),
    nodeTurn - 360 * Math.floor(nodeTurn / 360) + twist,
  )
  let gust = 0
  let veer = 0
  let windMean = nodeWind
  let ramp = nodeWind > CUT_IN_MS ? 1 : 0
  let idle = ramp === 0
  let storm = false
  let running = false
  let power = 0
  let pitch = 0
  let rotorSpeed = 0

  const sums = new SecondSums()

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
        // The vane before correction does not show what the controller adds.
        if (vaneLogged === 'beforeCorrection') loggedShift += changes[nextChange]!.addedDeg
        offset = changes[nextChange]!.toDeg
        nextChange++
      }
      const standing = offset / gain
      if (faulty) {
        const atS = endS - NODE_S
        vaneFaults.update(atS)
        nacelleFaults.update(atS)
        anemometerFaults.update(atS)
        maker.averageAcrossNorth = scenario.averageAcrossNorth || nacelleFaults.averagedAcrossNorth
        if (behaviourChangesS.some((second) => second > atS - NODE_S && second <= atS)) {
          controller.behave(yawBehaviour(scenario, faults, atS))
        }
      }
      const secondShift =
        second === null
          ? 0
          : second + loggedShift - vaneSlowNoiseDeg * secondSlow.step() - vaneFaults.secondDriftDeg

      for (let i = nodeS; i < nodeS + NODE_S; i++) {
        nodeWind += stepWind
        nodeTurn += stepTurn
        nodeVane += stepVane
        nodeError += stepError
        gust = keep5 * gust + fresh5 * gustNoise[i]!
        veer = keep5 * veer + fresh5 * (link * gustNoise[i]! + apart * veerNoise[i]!)

        // Yaw error as the rotor feels it, and as the point of the vane does.
        let error = nodeTurn - controller.headingDeg
        error -= 360 * Math.floor((error + 180) * (1 / 360))
        const flow = gain * (error + veerSize * veer) - offset
        let vane = flow + nodeVane + vaneNoiseDeg * vaneNoise[i]!
        if (codeStep > 0) vane = Math.round(vane / codeStep) * codeStep
        vane -= 360 * Math.floor((vane + 180) * (1 / 360))
        if (faulty) vane = vaneFaults.read(vane, vaneNoiseDeg * vaneNoise[i]!, running)
        if (second !== null) {
          const other = flow + vaneNoiseDeg * secondNoise.normal() - secondShift
          secondVaneDeg[i] = other - 360 * Math.floor((other + 180) * (1 / 360))
        }

        const bend =
          flow > RESPONSE_MAX_DEG ? RESPONSE_MAX_DEG : flow < -RESPONSE_MAX_DEG ? -RESPONSE_MAX_DEG : flow
        const response = 1 + bend * (responsePerDeg + bend * (square + bend * cube))
        let wind =
          nodeWind * (1 + gustSize * gust) * anemometerGain * response * (1 + nodeError) +
          anemometerNoiseMs * windNoise[i]!
        if (wind < 0) wind = 0
        if (faulty) wind = anemometerFaults.read(wind)
        windMean = keepMinute * windMean + (1 - keepMinute) * wind

        // State.
        if (storm ? windMean < STORM_END_MS : windMean > STORM_MS) storm = !storm
        if (idle ? windMean > CUT_IN_MS : windMean < IDLE_MS) idle = !idle
        const untwisting = controller.untwisting
        running = stop === 0 && !idle && !storm && !untwisting
        ramp = running ? (ramp < 1 ? ramp + 1 / START_S : 1) : 0

        controller.step(vane, running, windMean, stop)
        const heading = controller.headingDeg

        let logged = vane - loggedShift
        if (loggedShift !== 0) logged -= 360 * Math.floor((logged + 180) / 360)
        if (faulty) logged = vaneFaults.logged(logged)

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
          sums.clearS++
          sums.clear += available
          sums.lostStatic += corrected - available
          sums.lostDynamic += faced - corrected
          if (available < 0.95 * rated) sums.addBelowRated(error, faulty ? logged : vane - loggedShift)
        }

        const allowed = available < limit ? available : limit
        const targetPower = running ? allowed * ramp + CONSUMPTION_KW * (1 - ramp) : CONSUMPTION_KW
        power += (targetPower - power) * (1 / ROTOR_S)
        if (power > 0) sums.produced += power
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
        const moving = controller.yawing !== 0 || untwisting ? 1 : 0
        windMs[i] = wind
        vaneDeg[i] = logged
        headingDeg[i] = faulty ? nacelleFaults.read(heading, stop) : heading
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

  return { sums: sums.finished(controller.moves, controller.travelDeg), nacelleSteps: nacelleFaults.steps }
}
