/** The state of one bench: what is picked, how long the runs are, how it is driven; and the one way it writes. */
import { appendEntries, type Draft } from '$lib/device/append';
import { DeviceError } from '$lib/device/errors';
import type { DeviceStore } from '$lib/device/store';
import type { Seam } from '$lib/logbook/fold/seam';
import { keepCrew, keepSeam, recallCrew, recallSeam } from './memory';
import type { HowDriven, Pick, RunLength } from './run';

/** A press so soon after the one before is the same press: gloves bounce, and so do pedals. Nothing is said. */
const BOUNCE = 350;
/** Sooner than this after one that counted it may have been meant: it is not counted, and the screen says so. */
const APART = 700;
const ANSWER = 700;
/** Felt in a glove, and told apart: ms on, off, on. */
const WRITTEN = 60;
const TOO_SOON = [30, 40, 30];
const FAILED = [80, 80, 80];
export const ZOOMS = [24, 66, 96, 128] as const;

/** What was pressed. */
export type Act = 'drive' | 'undo' | 'sheet';

export interface Answer {
	readonly big: string;
	readonly holes: string;
	readonly wrong?: boolean;
	/** Nothing was written. */
	readonly notice?: boolean;
}

export class BenchWork {
	readonly #store: DeviceStore;
	readonly #build: string;
	readonly #seam: () => Seam | undefined;

	#length = $state<RunLength>(5);
	#how = $state.raw<HowDriven>({});
	#zoom = $state(1);
	#pick = $state.raw<Pick>();
	#busy = $state(false);
	#problem = $state<string>();
	#answer = $state.raw<Answer>();
	#said = $state('');
	/** The last line written here; until the fold shows it, what is next would still be what was just driven. */
	#awaited = $state<string>();
	/** When each key was pressed last and it counted; and when it was touched at all. */
	readonly #pressed: Partial<Record<Act, number>> = {};
	readonly #touched: Partial<Record<Act, number>> = {};
	#timer: ReturnType<typeof setTimeout> | undefined;

	constructor(store: DeviceStore, build: string, seam: () => Seam | undefined) {
		this.#store = store;
		this.#build = build;
		this.#seam = seam;
	}

	get length(): RunLength {
		return this.#length;
	}
	get how(): HowDriven {
		return this.#how;
	}
	/** CSS pixels from hole to hole. */
	get pitch(): number {
		return ZOOMS[this.#zoom] ?? 66;
	}
	get zoom(): number {
		return this.#zoom;
	}
	get pick(): Pick | undefined {
		return this.#pick;
	}
	/** Why nothing was saved. Stays until the next try. */
	get problem(): string | undefined {
		return this.#problem;
	}
	get answer(): Answer | undefined {
		return this.#answer;
	}
	/** What was done last, for whoever hears the screen. */
	get said(): string {
		return this.#said;
	}
	/** What is shown is what is in the log: nothing is being written, and the last line written has arrived in the fold. */
	get ready(): boolean {
		const awaited = this.#awaited;
		return (
			!this.#busy &&
			(awaited === undefined || (this.#seam()?.lines.some(({ id }) => id === awaited) ?? false))
		);
	}

	async recall(seam: string): Promise<void> {
		const [memory, crew] = await Promise.all([
			recallSeam(this.#store, this.#build, seam),
			recallCrew(this.#store, this.#build)
		]);
		this.#length = memory.length ?? 5;
		this.#zoom = memory.zoom !== undefined && memory.zoom in ZOOMS ? memory.zoom : 1;
		this.#how = { ...(memory.method && { method: memory.method }), ...crew };
	}

	setLength(length: RunLength): void {
		this.#length = length;
		this.#keep();
	}

	setHow(how: HowDriven): void {
		this.#how = how;
		this.#keep();
		const { shooter, bucker } = how;
		void keepCrew(this.#store, this.#build, {
			...(shooter !== undefined && { shooter }),
			...(bucker !== undefined && { bucker })
		}).catch(() => undefined);
	}

	zoomBy(step: 1 | -1): void {
		this.#zoom = Math.min(ZOOMS.length - 1, Math.max(0, this.#zoom + step));
		this.#keep();
	}

	/** The first tap picks a hole, the second the range to it, a third begins again. */
	tap(hole: Pick['first']): void {
		const pick = this.#pick;
		if (pick && pick.last === undefined)
			this.#pick = pick.first === hole ? undefined : { first: pick.first, last: hole };
		else this.#pick = { first: hole };
	}

	pickRange(first: Pick['first'], last: Pick['first']): void {
		this.#pick = { first, last };
	}

	backToNext(): void {
		this.#pick = undefined;
	}

	/** Closing a sheet without writing leaves its complaint behind. */
	forgetProblem(): void {
		this.#problem = undefined;
	}

	/**
	 * Writes lines and answers once they are on the disk, not before.
	 * @returns whether they are; if not, `problem` says why and what was kept
	 */
	async write(act: Act, drafts: readonly Draft[], answer: Answer): Promise<boolean> {
		if (drafts.length === 0) return false;
		const now = performance.now();
		const bounced = now - (this.#touched[act] ?? -Infinity) < BOUNCE;
		this.#touched[act] = now;
		if (bounced) return false;
		if (!this.ready || now - (this.#pressed[act] ?? -Infinity) < APART) {
			this.#show({ big: 'tap again', holes: 'that tap was not counted', notice: true }, TOO_SOON);
			return false;
		}
		this.#pressed[act] = now;
		this.#busy = true;
		this.#problem = undefined;
		try {
			const entries = await appendEntries(this.#store, this.#build, drafts);
			this.#awaited = entries.findLast((entry) => entry.seam === this.#seam()?.id)?.id;
			this.#pick = undefined;
			this.#show(answer, WRITTEN);
			return true;
		} catch (error) {
			this.#problem =
				error instanceof DeviceError
					? error.message
					: 'This could not be written. Nothing was saved. Reload the page and do it again.';
			vibrate(FAILED);
			return false;
		} finally {
			this.#busy = false;
		}
	}

	leave(): void {
		clearTimeout(this.#timer);
	}

	#show(answer: Answer, pattern: number | number[]): void {
		this.#answer = answer;
		this.#said = `${answer.big} ${answer.holes}`;
		vibrate(pattern);
		clearTimeout(this.#timer);
		this.#timer = setTimeout(() => {
			this.#answer = undefined;
		}, ANSWER);
	}

	/** Forgetting how long a run was is no reason to stop anybody. */
	#keep(): void {
		const seam = this.#seam()?.id;
		if (seam === undefined) return;
		void keepSeam(this.#store, this.#build, seam, {
			length: this.#length,
			zoom: this.#zoom,
			...(this.#how.method !== undefined && { method: this.#how.method })
		}).catch(() => undefined);
	}
}

/** Not every browser can. */
function vibrate(pattern: number | number[]): void {
	if ('vibrate' in navigator) navigator.vibrate(pattern);
}
