export type { FrameStore } from './frames.ts'
export { openStore, type Store, type StoreOptions } from './open-store.ts'
export type { ReplayStore, StoredReplay } from './replays.ts'
