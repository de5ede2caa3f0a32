/** Chance that can be had again: the same seed gives the same numbers on every device. Not for keys. */
export class Random {
	#a: number;
	#b: number;
	#c: number;
	#counter = 1;

	/** @param seed any text; one text has one sequence */
	constructor(seed: string) {
		// FNV-1a over the UTF-16 units, three times with other starts.
		const hash = (start: number) => {
			let h = start;
			for (let i = 0; i < seed.length; i++) h = Math.imul(h ^ seed.charCodeAt(i), 0x01000193);
			return h >>> 0;
		};
		this.#a = hash(0x811c9dc5);
		this.#b = hash(0x9e3779b9);
		this.#c = hash(0x85ebca6b);
		// The first numbers still show the seed.
		for (let i = 0; i < 12; i++) this.next32();
	}

	/** A whole number from 0 to 2^32-1, by sfc32 (Chris Doty-Humphrey's small fast counting generator). */
	next32(): number {
		const t = (this.#a + this.#b + this.#counter++) | 0;
		this.#a = this.#b ^ (this.#b >>> 9);
		this.#b = (this.#c + (this.#c << 3)) | 0;
		this.#c = (((this.#c << 21) | (this.#c >>> 11)) + t) | 0;
		return t >>> 0;
	}

	/** A whole number, both ends included. */
	between(least: number, most: number): number {
		return least + Math.floor((this.next32() / 2 ** 32) * (most - least + 1));
	}

	/** True in so many of cases, from 0 to 1. */
	chance(share: number): boolean {
		return this.next32() / 2 ** 32 < share;
	}

	pick<T>(list: readonly [T, ...T[]]): T {
		return list[this.between(0, list.length - 1)] as T;
	}

	/** As `crypto.getRandomValues` does. */
	fill(bytes: Uint8Array): void {
		for (let i = 0; i < bytes.length; i++) bytes[i] = this.next32() >>> 24;
	}
}
