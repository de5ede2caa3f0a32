/**
 * Ids: UUID v7 (RFC 9562), made where a line is written. Pure: clock and chance are handed in.
 */

/** Fills the bytes with chance, as `crypto.getRandomValues` does. */
export type Chance = (bytes: Uint8Array<ArrayBuffer>) => unknown;

/** A clock that steps back by less than this is waited out; by more it was set, and is followed. */
const STEP_BACK = 10_000;
const LATEST = 2 ** 48 - 1;

/**
 * A maker of ids, each greater than the one before, also within one millisecond: lines written by one
 * device in one go keep their order where ids break a tie.
 *
 * @param now milliseconds since 1970; a clock that is off gives an id that is off, never none
 */
export function idMaker(now: () => number, chance: Chance): () => string {
	let last = -1;
	let counter = 0;
	const bytes = new Uint8Array(10);
	return () => {
		chance(bytes);
		const at = Math.min(Math.max(Math.trunc(now()), 0), LATEST);
		const start = (((bytes[0] as number) << 8) | (bytes[1] as number)) & 0x7ff;
		if (at > last || at < last - STEP_BACK) {
			last = at;
			counter = start;
		} else if (++counter > 0xfff) {
			// 4096 ids in a millisecond: borrow from the next one.
			last++;
			counter = start;
		}
		bytes[2] = ((bytes[2] as number) & 0x3f) | 0x80;
		const time = last.toString(16).padStart(12, '0');
		let tail = '';
		for (let i = 2; i < 10; i++) tail += (bytes[i] as number).toString(16).padStart(2, '0');
		return `${time.slice(0, 8)}-${time.slice(8)}-7${counter.toString(16).padStart(3, '0')}-${tail.slice(0, 4)}-${tail.slice(4)}`;
	};
}
