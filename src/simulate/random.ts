/** Step of splitmix32. */
const WEYL = 0x9e3779b9
const LAYERS = 128
/** Right edge of the lowest layer and area of each layer of a ziggurat with 128 layers. */
const TAIL_START = 3.442619855899
const LAYER_AREA = 9.91256303526217e-3
const LAYER_X = new Float64Array(LAYERS + 1)
const LAYER_Y = new Float64Array(LAYERS + 1)

{
  const density = (x: number) => Math.exp(-0.5 * x * x)
  LAYER_X[0] = LAYER_AREA / density(TAIL_START)
  LAYER_X[1] = TAIL_START
  for (let i = 2; i < LAYERS; i++) {
    const x = LAYER_X[i - 1]!
    LAYER_X[i] = Math.sqrt(-2 * Math.log(LAYER_AREA / x + density(x)))
  }
  LAYER_X[LAYERS] = 0
  for (let i = 0; i <= LAYERS; i++) LAYER_Y[i] = density(LAYER_X[i]!)
}

/**
 * A stream of pseudo-random numbers that depends on its keys and on nothing else: one for each purpose and turbine, so
 * that a further turbine, or a further draw for one purpose, leaves every other stream as it was.
 *
 * The kernel's generator again, but with its state in a typed array behind a method: a loop of 1 s steps draws 100 million
 * numbers, and a closure for each stream was seen to leave that loop unoptimised at random (2.5 times the time).
 *
 * @source xoshiro128** of Blackman & Vigna (2021), seeded by splitmix32; normal deviates by the ziggurat of Marsaglia & Tsang (2000), with separate bits for
 *   layer, sign and abscissa (Doornik 2005).
 */
export class RandomStream {
  readonly #state = new Int32Array(4)

  /** @param keys whole numbers, taken modulo 2^32; their order counts. */
  constructor(...keys: number[]) {
    let mix = 0
    for (const key of keys) mix = scramble(mix ^ key)
    for (let i = 0; i < 4; i++) {
      mix = (mix + WEYL) | 0
      let z = Math.imul(mix ^ (mix >>> 16), 0x85ebca6b)
      z = Math.imul(z ^ (z >>> 13), 0xc2b2ae35)
      this.#state[i] = z ^ (z >>> 16)
    }
    if (this.#state.every((word) => word === 0)) this.#state[3] = 1 // the all-zero state never leaves zero
  }

  /** A number in [0, 1) with 32 random bits. */
  uniform(): number {
    return this.#next() / 4294967296
  }

  /** A number in [from, to). */
  between(from: number, to: number): number {
    return from + (to - from) * this.uniform()
  }

  /** A deviate of the standard normal distribution. */
  normal(): number {
    for (;;) {
      const bits = this.#next()
      const layer = bits & (LAYERS - 1)
      const sign = bits & LAYERS ? -1 : 1
      const u = (bits >>> 8) / 16777216
      const x = u * LAYER_X[layer]!
      if (x < LAYER_X[layer + 1]!) return sign * x
      if (layer === 0) return sign * this.#tail()
      const y = LAYER_Y[layer]! + (LAYER_Y[layer + 1]! - LAYER_Y[layer]!) * this.uniform()
      if (y < Math.exp(-0.5 * x * x)) return sign * x
    }
  }

  /** Fills a buffer with standard normal deviates, the same ones that as many calls of `normal` would give. */
  fillNormal(buffer: Float64Array): void {
    for (let i = 0; i < buffer.length; i++) buffer[i] = this.normal()
  }

  #next(): number {
    const state = this.#state
    const a = state[0]!
    const b = state[1]!
    const c = state[2]! ^ a
    const d = state[3]! ^ b
    state[0] = a ^ d
    state[1] = b ^ c
    state[2] = c ^ (b << 9)
    state[3] = (d << 11) | (d >>> 21)
    const scaled = Math.imul(b, 5)
    return Math.imul((scaled << 7) | (scaled >>> 25), 9) >>> 0
  }

  #tail(): number {
    for (;;) {
      const x = -Math.log(1 - this.uniform()) / TAIL_START
      const y = -Math.log(1 - this.uniform())
      if (2 * y > x * x) return TAIL_START + x
    }
  }
}

/** One to one on 32 bits, and close keys come out far apart: a step of splitmix32 with other multipliers. */
function scramble(key: number): number {
  let z = (key + WEYL) | 0
  z = Math.imul(z ^ (z >>> 16), 0x21f0aaad)
  z = Math.imul(z ^ (z >>> 15), 0x735a2d97)
  return z ^ (z >>> 15)
}

/** What a stream is for; the numbers are part of every scenario's meaning and are never reused. */
export const PURPOSE = {
  synoptic: 1,
  mesoscale: 2,
  farmLimits: 3,
  setup: 10,
  offset: 11,
  position: 12,
  operation: 20,
  gust: 30,
  veer: 31,
  vaneNoise: 32,
  anemometerNoise: 33,
  slow: 34,
  drift: 35,
  secondVane: 36,
  vaneFault: 37,
  nacelleFault: 38,
  logger: 40,
  blemish: 50,
  scenario: 60,
} as const
