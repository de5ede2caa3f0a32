/**
 * Builds and logs of any size, out of a seed: for the example, for tests and for the bench. Pure; the same options give
 * the same bytes on every device.
 */
import { base64url, hashBytes, utf8 } from '$lib/logbook/bytes';
import type { Entry } from '$lib/logbook/entry';
import { devicesOf, EXAMPLE_CREW, membersOf, type Device, type Member } from './crew';
import { Evenings } from './evenings';
import { open, startOnPaper } from './opening';
import { EXAMPLE_BUILD } from './ids';
import { Pen } from './pen';
import { readPlan } from './plan';
import planText from './plan.csv?raw';
import { Random } from './random';
import { Shop } from './shop';

export interface GenerateOptions {
	readonly seed?: string | number;
	/** Id of the build; made where it is left out. */
	readonly build?: string;
	/** Name of the build. */
	readonly name?: string;
	/** Seams planned at the start: 130 is the whole example, more repeat it with numbers appended. */
	readonly seams?: number;
	/** Exactly so many entries, planning more seams when the work runs out. Otherwise the evenings decide. */
	readonly entries?: number;
	readonly evenings?: number;
	/** How many, or who: the first is the owner. */
	readonly people?: number | readonly Member[];
	/** How many, or which: the first is the owner's. */
	readonly devices?: number | readonly Device[];
	/** Day of the first line, `2025-11-15`. */
	readonly from?: string;
	/** Day of the last evening, instead of that of the first line. */
	readonly until?: string;
	/** Minutes the clocks are ahead of Greenwich, all year. */
	readonly offset?: number;
	/** Adds the lines the server would write about the crew. Leave out where a real server writes its own. */
	readonly crewLines?: boolean;
	/** Public key of a device as it stands in `device.enrolled`; without it, text that is no key. */
	readonly keyOf?: (device: Device, index: number) => string;
}

export interface GeneratedLog {
	readonly build: string;
	readonly name: string;
	readonly members: readonly Member[];
	readonly devices: readonly Device[];
	/** In an order in which each may be accepted: everything a line refers to comes before it. */
	readonly entries: readonly Entry[];
	/** The same entries in the same order, cut wherever another device goes on: what one push may carry. */
	readonly batches: readonly { readonly device: string; readonly entries: readonly Entry[] }[];
}

const DAY = 86_400_000;
const EVENINGS = 150;
/** Entries of an ordinary evening, about: longer logs are written faster, not over more years. */
const ENTRIES_AN_EVENING = 15;
/** As many as a push takes. */
const MOST_IN_BATCH = 200;

/**
 * The invented crew's year on the whole plan, about half done, with things left to settle. It ends the evening before
 * `today`, by clocks that go as those of who looks at it.
 */
export function exampleLog({
	today,
	offset
}: {
	/** `2026-12-01` */
	readonly today: string;
	/** Minutes the clocks are ahead of Greenwich. */
	readonly offset: number;
}): GeneratedLog {
	return generateLog({
		seed: 'yarrow two 49',
		build: EXAMPLE_BUILD,
		evenings: EVENINGS,
		people: EXAMPLE_CREW,
		devices: 6,
		crewLines: true,
		until: new Date((dayOf(today) - 1) * DAY).toISOString().slice(0, 10),
		offset
	});
}

/** @throws RangeError for a `from` or `until` that is no day */
export function generateLog(options: GenerateOptions = {}): GeneratedLog {
	const { seams = 130, entries, from = '2025-11-15', evenings = EVENINGS, until } = options;
	const seed = String(options.seed ?? 1);
	const random = new Random(seed);
	const pace = entries === undefined ? 1 : Math.max(1, entries / (evenings * ENTRIES_AN_EVENING));
	const day =
		until === undefined ? dayOf(from) : dayOf(until) - nthEvening(new Random(seed), evenings);
	const pen = new Pen(random, { day, pace, offset: options.offset ?? -420, build: options.build });
	const newId = () => pen.newId('');
	const people = options.people ?? 4;
	const members = typeof people === 'number' ? membersOf(people, newId) : people;
	const wanted = options.devices ?? members.length + 1;
	const devices = typeof wanted === 'number' ? devicesOf(wanted, members, newId) : wanted;
	const [first, ...rest] = devices;
	if (!first || first.person !== members[0]?.id)
		throw new RangeError('the first device is the owner’s, who is the first of the people');

	const last = entries === undefined ? evenings : Infinity;
	const shop = new Shop(pen, members, [first, ...rest], readPlan(planText), last);
	const name = options.name ?? 'Yarrow Two';
	open(shop, name, options.keyOf ?? noKey, options.crewLines ?? false);
	shop.planSeams(seams);
	startOnPaper(shop);
	const crew = new Evenings(shop);
	const enough = () =>
		entries === undefined
			? shop.evening >= evenings || shop.queue.length === 0
			: pen.entries.length >= entries;
	for (const after of eveningsFrom(new Random(seed))) {
		if (enough()) break;
		crew.spend(day + after, Math.ceil(random.between(12, 46) * pace));
		if (shop.queue.length === 0 && entries !== undefined) shop.planSeams(130);
	}
	const all = entries === undefined ? pen.entries : pen.entries.slice(0, entries);
	return { build: pen.build, name, members, devices, entries: all, batches: batchesOf(all) };
}

/** In days since 1970. */
function dayOf(text: string): number {
	const day = Math.floor(Date.parse(text) / DAY);
	if (!Number.isFinite(day)) throw new RangeError(`“${text}” is not a day`);
	return day;
}

/** When the crew meets, in days after the first: two to four evenings a week, on any day. */
function* eveningsFrom(random: Random): Generator<number, never> {
	for (let week = 0; ; week += 7) {
		const inWeek = [1, 2, 3, 4, 5, 6, 7];
		for (let keep = random.between(2, 4); inWeek.length > keep;)
			inWeek.splice(random.between(0, inWeek.length - 1), 1);
		for (const weekday of inWeek) yield week + weekday;
	}
}

function nthEvening(random: Random, nth: number): number {
	const evenings = eveningsFrom(random);
	let day = 0;
	for (let i = 0; i < nth; i++) day = evenings.next().value;
	return day;
}

/** Text of the right form that is no key: nothing can be sealed with it. */
function noKey({ id }: Device): string {
	const bytes = new Uint8Array(65);
	bytes.set(hashBytes(utf8(id)), 1);
	return base64url(bytes);
}

function batchesOf(entries: readonly Entry[]): GeneratedLog['batches'] {
	const batches: { device: string; entries: Entry[] }[] = [];
	for (const entry of entries) {
		const last = batches.at(-1);
		if (last?.device === entry.device && last.entries.length < MOST_IN_BATCH)
			last.entries.push(entry);
		else batches.push({ device: entry.device, entries: [entry] });
	}
	return batches;
}
