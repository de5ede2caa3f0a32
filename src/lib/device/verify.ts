/**
 * What the server sent, before any of it is stored: links recomputed, the server's signature and the seals checked.
 * A line whose seal does not hold is kept and reported, never dropped: what is in the log must be seen.
 */
import { hashText } from '$lib/logbook/bytes';
import { next, placeStatement, type Place } from '$lib/logbook/chain';
import { partOf, readEntry, type Envelope } from '$lib/logbook/entry';
import { lineOf, type Line } from '$lib/logbook/fold/line';
import { traits } from '$lib/logbook/kinds';
import { readPublicKey, sealName, verify, verifySeal, type Seal } from '$lib/logbook/seal';
import type { PullAnswer, PulledLine, SignedPlace } from '$lib/logbook/wire';
import { BrokenHistory } from './faults';
import { envelopeOf } from './lines';
import type { BuildRow, DeviceRow, EntryRow, LineFinding, SealRow } from './schema';

/** A line of a page with its place, ready to be stored. */
interface CheckedLine {
	readonly row: EntryRow;
	readonly line: Line | undefined;
}

export interface CheckedPage {
	readonly from: Place;
	readonly lines: readonly CheckedLine[];
	readonly seals: readonly SealRow[];
	/** Enrolled in this page. */
	readonly devices: readonly DeviceRow[];
	/** The signature is empty when no known key fits it. */
	readonly next: SignedPlace;
	/** The device of the server, once its key has been recognised. */
	readonly server: string | undefined;
	readonly head: number;
	readonly maxN: number;
}

/** Public keys by their text; importing one costs as much as a verification. */
export class Keys {
	readonly #keys = new Map<string, Promise<CryptoKey | undefined>>();

	get(text: string): Promise<CryptoKey | undefined> {
		let key = this.#keys.get(text);
		if (!key) this.#keys.set(text, (key = readPublicKey(text)));
		return key;
	}
}

/**
 * @param row the build as it was when the page was asked for
 * @param known the devices enrolled so far
 * @throws BrokenHistory when the lines do not lead from the cursor to the place the answer names
 */
export async function checkPage(
	row: BuildRow,
	known: readonly DeviceRow[],
	answer: PullAnswer,
	keys: Keys
): Promise<CheckedPage> {
	const { build, history } = row;
	const from: Place = { seq: row.cursor.seq, link: row.cursor.link };
	let place = from;
	const enrolled = new Map(known.map((device) => [device.device, device]));
	const devices: DeviceRow[] = [];
	const lines: { row: EntryRow; line: Line | undefined; seal: number | undefined }[] = [];
	for (const pulled of answer.entries) {
		const read = readPulled(build, pulled);
		try {
			place = next(place, { seq: pulled.seq, received: pulled.received, hash: read.row.hash });
		} catch (error) {
			throw new BrokenHistory('a line is missing or doubled', { cause: error });
		}
		const { row: entryRow, line } = read;
		if (line?.entry?.kind === 'device.enrolled') {
			const { entry } = line;
			const { key } = entry.body;
			const there = enrolled.get(entry.device);
			if (!there) {
				const device = { build, device: entry.device, key, person: entry.author, line: entry.id };
				enrolled.set(entry.device, device);
				devices.push(device);
			} else if (there.key !== key) entryRow.finding = 'device.other_key';
		}
		entryRow.seq = pulled.seq;
		entryRow.received = pulled.received;
		entryRow.history = history;
		lines.push({ row: entryRow, line, seal: pulled.seal });
	}
	const end = answer.next;
	if (place.seq !== end.seq || place.link !== end.link || answer.head < end.seq)
		throw new BrokenHistory('the lines do not lead to the place that was named');
	if (answer.entries.length === 0 && answer.head > end.seq)
		throw new BrokenHistory('lines were announced and not sent');

	const server = await serverOf(row, enrolled, end, keys);
	const seals = await checkSeals(build, lines, answer.seals, enrolled, keys);
	for (const { row: entryRow, line } of lines) {
		const person = enrolled.get(entryRow.device)?.person;
		// Once recognised it stays the server's, also where a place lacks its signature.
		if (!isInOwnName(entryRow, line?.envelope.v, person, row.server ?? server))
			entryRow.finding ??= 'device.other_person';
	}
	return {
		from,
		lines,
		seals,
		devices,
		next: { seq: end.seq, link: end.link, signature: server === undefined ? '' : end.signature },
		server,
		head: answer.head,
		maxN: answer.maxN
	};
}

function readPulled(build: string, pulled: PulledLine): { row: EntryRow; line: Line | undefined } {
	if (pulled.withdrawn) {
		const { hash, envelope: text, by } = pulled.withdrawn;
		const envelope = envelopeOf(text);
		const row = { ...rowOf(build, envelope, '', hash), withdrawn: { envelope: text, by } };
		return { row, line: envelope && { id: envelope.id, envelope, unreadable: 'withdrawn' } };
	}
	const text = pulled.text ?? '';
	const reading = readEntry(text);
	if (reading.ok)
		return {
			row: { ...rowOf(build, reading.entry, text, reading.hash), sound: 1 },
			line: lineOf(reading)
		};
	const hash = hashText(text);
	return { row: rowOf(build, reading.envelope, text, hash), line: lineOf(reading) };
}

function rowOf(
	build: string,
	envelope: Omit<Envelope, 'body'> | undefined,
	text: string,
	hash: string
): EntryRow {
	// Accepted by a server this app does not understand at all. Kept under a name no line can have.
	if (!envelope)
		return { build, id: `?${hash}`, part: '', n: 0, kind: '', device: '', author: '', text, hash };
	const { id, n, kind, device, author } = envelope;
	return { build, id, part: partOf(envelope), n, kind, device, author, text, hash };
}

/** Gives each line the seal that covers it, or the finding that none does. */
async function checkSeals(
	build: string,
	lines: readonly { row: EntryRow; seal: number | undefined }[],
	seals: readonly Seal[],
	enrolled: ReadonlyMap<string, DeviceRow>,
	keys: Keys
): Promise<SealRow[]> {
	const checked = new Map<number, { name: string; holds: boolean; hashes: Set<string> }>();
	const kept: SealRow[] = [];
	for (const { row, seal: index } of lines) {
		const seal = index === undefined ? undefined : seals[index];
		if (index === undefined || !seal) {
			row.finding ??= 'seal.missing';
			continue;
		}
		let state = checked.get(index);
		if (!state) {
			const key = enrolled.get(seal.device)?.key;
			const imported = key === undefined ? undefined : await keys.get(key);
			const holds = imported !== undefined && (await verifySeal(imported, build, seal));
			state = { name: sealName(seal), holds, hashes: new Set(seal.hashes) };
			checked.set(index, state);
			kept.push({ build, name: state.name, ...seal });
		}
		row.seal = state.name;
		const finding = sealFinding(row, seal.device, state, enrolled);
		if (finding) row.finding ??= finding;
	}
	return kept;
}

function sealFinding(
	row: EntryRow,
	sealedBy: string,
	{ holds, hashes }: { readonly holds: boolean; readonly hashes: ReadonlySet<string> },
	enrolled: ReadonlyMap<string, DeviceRow>
): LineFinding | undefined {
	if (!enrolled.has(row.device)) return 'device.unknown';
	return sealedBy === row.device && hashes.has(row.hash) && holds ? undefined : 'seal.broken';
}

/**
 * May a device write this line in its author's name? A person's device in its person's only, whatever its seal is worth:
 * else a member of the crew logs, signs and hands over in the name of another. The server's device in the name of
 * whoever acted, but only what nobody else may write, and its own enrolment.
 */
export function isInOwnName(
	{ kind, device, author }: Pick<EntryRow, 'kind' | 'device' | 'author'>,
	v: number | undefined,
	person: string | undefined,
	server: string | undefined
): boolean {
	const serverOnly = v !== undefined && traits(kind, v)?.writer === 'server';
	if (device === server) return serverOnly || kind === 'device.enrolled';
	return !serverOnly && (person === undefined || person === author);
}

/**
 * Which enrolled device signed this place: the server's, which writes into every build. The first one recognised is
 * remembered and the only one believed afterwards. Undefined: nobody whose key is known did.
 */
async function serverOf(
	row: BuildRow,
	enrolled: ReadonlyMap<string, DeviceRow>,
	place: SignedPlace,
	keys: Keys
): Promise<string | undefined> {
	const candidates = row.server === undefined ? [...enrolled.values()] : [enrolled.get(row.server)];
	for (const device of candidates) {
		const key = device && (await keys.get(device.key));
		if (key && (await verify(key, placeStatement(row.build, place), place.signature)))
			return device.device;
	}
	return undefined;
}
