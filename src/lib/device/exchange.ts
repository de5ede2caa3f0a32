/**
 * A store as a file, and back: the last resort when a device never reaches the server again, and the way to hand a log
 * over. What a file says of a line is worth no more than the seals in it: every line is checked like one that arrives.
 */
import * as z from 'zod/mini';
import { canonicalText, hashText, NotCanonical, type Json } from '$lib/logbook/bytes';
import { byOrder, partOf, readEntry, type Envelope } from '$lib/logbook/entry';
import { foldBuild } from '$lib/logbook/fold/build';
import { lineOf, type Line } from '$lib/logbook/fold/line';
import { N_LEAP } from '$lib/logbook/judge';
import { traits } from '$lib/logbook/kinds';
import { Id, Signature } from '$lib/logbook/scalars';
import {
	makeSeal,
	sealName,
	sealStatement,
	verify,
	verifySeal,
	type Seal
} from '$lib/logbook/seal';
import { MOST_PUSHED, SealMessage } from '$lib/logbook/wire';
import { newBuildRow } from './append';
import { wallTime } from './clock';
import { recount, settled, writing } from './counting';
import { DeviceError } from './errors';
import { quiet } from './handle';
import { sealOwn } from './outgoing';
import { within, type EntryRow, type OutboxRow, type OutboxState } from './schema';
import type { DeviceStore } from './store';
import { isInOwnName, Keys } from './verify';

/** How the name of an exported file ends. */
const EXPORT_SUFFIX = '.tallybar.json';

const FORMAT = 'tallybar-export';

/** Later versions of the app may write more fields; all but `lines` and `seal` are under the seal as they stand. */
const ExportFile = z.object({
	format: z.literal(FORMAT),
	v: z.literal(1),
	build: Id,
	/** The device that exported, and its key. */
	device: Id,
	key: z.string(),
	person: Id,
	exportedAt: z.string(),
	/** Canonical texts, in order of n, device, id. */
	lines: z.array(z.string()),
	seals: z.array(SealMessage),
	/** For people: where the lines stood on their way to the server. */
	states: z.array(z.object({ id: Id, state: z.string(), code: z.optional(z.string()) })),
	/** Lines this device could not vouch for, and its own whose id another line has in the log; not imported. */
	unsealed: z.array(z.string()),
	/** Over the hashes of all lines in their order, then the hash of everything else in the file. */
	seal: z.object({ signature: Signature })
});
type ExportFile = z.output<typeof ExportFile>;

export interface Exported {
	/** Proposed name, ending in `.tallybar.json`. */
	readonly name: string;
	readonly text: string;
	readonly lines: number;
}

/**
 * Everything this device has of a build as one text: the lines, refused ones too, each under a seal of its device, and
 * the whole under a seal of this one.
 * @throws DeviceError `build.unknown` when the build is not on this device
 */
export async function exportBuild(store: DeviceStore, build: string): Promise<Exported> {
	const found = await store.handle.run(async (db) => {
		const tx = db.transaction(['builds', 'entries', 'outbox', 'seals'], 'readonly');
		const [row, entries, outbox, seals] = await Promise.all([
			tx.objectStore('builds').get(build),
			tx.objectStore('entries').getAll(within(build)),
			tx.objectStore('outbox').getAll(within(build)),
			tx.objectStore('seals').getAll(within(build))
		]);
		await tx.done;
		return { row, entries, outbox, seals };
	});
	if (!found.row) throw new DeviceError('build.unknown');

	const stored = new Map(found.seals.map((seal) => [seal.name, seal]));
	const used = new Map<string, Seal>();
	const own: [device: string, hash: string][] = [];
	const lines: EntryRow[] = [];
	const unsealed: string[] = [];
	for (const row of [...found.entries].sort(byOrder)) {
		// To be read and written again; under an id that another line has it can never be taken in.
		if (row.conflict) unsealed.push(row.conflict.text);
		// Without its body a withdrawn line cannot be offered; who imports gets it with the next sync.
		if (row.withdrawn) continue;
		const seal = row.seal === undefined ? undefined : stored.get(row.seal);
		const vouched = row.finding === undefined || row.finding === 'entry.id_conflict';
		if (vouched && seal?.device === row.device) used.set(seal.name, seal);
		else if (await store.keysOf(row.device)) own.push([row.device, row.hash]);
		else {
			unsealed.push(row.text);
			continue;
		}
		lines.push(row);
	}
	const seals = [...used.values()].map(({ device, hashes, signature }) => ({
		device,
		hashes: [...hashes],
		signature
	}));
	for (const chunk of chunksByDevice(own))
		for (const seal of await sealOwn(store, build, chunk))
			seals.push({ ...seal, hashes: [...seal.hashes] });

	const rest: Omit<ExportFile, 'lines' | 'seal'> = {
		format: FORMAT,
		v: 1,
		build,
		device: store.device,
		key: store.keys.publicKey,
		person: store.person,
		exportedAt: wallTime(store.env),
		seals,
		// One whose id another line has in the log: said of that, it would not count where the file is imported.
		states: found.outbox
			.filter(({ replaced }) => !replaced)
			.map(({ id, state, code }) => ({ id, state, ...(code !== undefined && { code }) })),
		unsealed
	};
	const hashes = [...lines.map(({ hash }) => hash), hashText(canonicalText(rest))];
	const { signature } = await makeSeal(store.keys.pair.privateKey, build, store.device, hashes);
	const file: ExportFile = { ...rest, lines: lines.map(({ text }) => text), seal: { signature } };
	const day = rest.exportedAt.slice(0, 10);
	const called = found.row.name
		.normalize('NFKD')
		.replace(/[^A-Za-z0-9]+/g, '-')
		.slice(0, 40);
	return {
		name: `${called || 'build'}-${day}${EXPORT_SUFFIX}`,
		text: JSON.stringify(file, undefined, '\t'),
		lines: lines.length
	};
}

/** Hashes by device, at most 200 to a seal, as pushes have them. */
function chunksByDevice(own: readonly [string, string][]): Map<string, string[]>[] {
	const byDevice = new Map<string, string[]>();
	for (const [device, hash] of own) {
		const hashes = byDevice.get(device);
		if (hashes) hashes.push(hash);
		else byDevice.set(device, [hash]);
	}
	const chunks: Map<string, string[]>[] = [];
	for (const [device, hashes] of byDevice)
		for (let i = 0; i < hashes.length; i += MOST_PUSHED)
			chunks.push(new Map([[device, hashes.slice(i, i + MOST_PUSHED)]]));
	return chunks;
}

/** A line of a file, with the seal in the file that covers it. */
interface ImportedLine {
	readonly row: EntryRow;
	readonly line: Line;
	readonly seal: Seal;
}

export interface ReadExport {
	readonly build: string;
	readonly device: string;
	readonly person: string;
	readonly exportedAt: string;
	readonly lines: readonly ImportedLine[];
	/** Keys by device, as the enrolments in the file say. */
	readonly keys: ReadonlyMap<string, string>;
	/** Whose devices they are, as those enrolments say. */
	readonly persons: ReadonlyMap<string, string>;
	readonly states: ReadonlyMap<
		string,
		{ readonly state: string; readonly code?: string | undefined }
	>;
	/** Lines the exporting device could not vouch for. They are not imported. */
	readonly unsealed: number;
}

/**
 * Reads an exported file and checks all of it: whoever changed, dropped, doubled or moved anything since is found.
 * @throws DeviceError `file.not_ours`, `file.damaged` or `file.seal_missing`; then nothing of it is to be used
 */
export async function readExport(text: string): Promise<ReadExport> {
	const { file, rest } = parse(text);
	const lines = file.lines.map((line) => readLine(line, file.build));
	if (new Set(lines.map(({ row }) => row.id)).size !== lines.length)
		throw new DeviceError('file.damaged', { detail: 'a line stands twice' });

	const keys = new Map<string, string>();
	const persons = new Map<string, string>();
	for (const { line } of lines) {
		const { entry } = line;
		if (entry?.kind !== 'device.enrolled' || keys.has(entry.device)) continue;
		keys.set(entry.device, entry.body.key);
		persons.set(entry.device, entry.author);
	}
	const servers = serversIn(lines);
	const imported = new Keys();
	// A device that never wrote here has no enrolment in the file; its key then only guards against accidents.
	const key = await imported.get(keys.get(file.device) ?? file.key);
	const hashes = [...lines.map(({ row }) => row.hash), hashText(rest)];
	const statement = sealStatement(file.build, file.device, hashes);
	if (!key || !(await verify(key, statement, file.seal.signature)))
		throw new DeviceError('file.damaged', { detail: 'the seal over the file does not fit' });

	const covering = new Map<string, Seal>();
	for (const seal of file.seals) {
		const sealedBy = await imported.get(keys.get(seal.device) ?? '');
		if (!sealedBy || !(await verifySeal(sealedBy, file.build, seal))) continue;
		for (const hash of seal.hashes) covering.set(`${seal.device} ${hash}`, seal);
	}
	return {
		build: file.build,
		device: file.device,
		person: file.person,
		exportedAt: file.exportedAt,
		keys,
		persons,
		states: new Map(file.states.map(({ id, state, code }) => [id, { state, code }])),
		unsealed: file.unsealed.length,
		lines: lines.map(({ row, line }) => {
			const seal = covering.get(`${row.device} ${row.hash}`);
			if (!seal) throw new DeviceError('file.seal_missing', { detail: row.id });
			const server = servers.has(row.device) ? row.device : undefined;
			if (!isInOwnName(row, line.envelope.v, persons.get(row.device), server))
				throw new DeviceError('file.damaged', { detail: `${row.id} is in the name of another` });
			return { row, line, seal };
		})
	};
}

/**
 * Which devices may be a server's: they wrote what only servers write, and nothing else. A file cannot prove more; a
 * store that knows the server of the build takes such lines from no other device.
 */
function serversIn(lines: readonly { readonly row: EntryRow; readonly line: Line }[]): Set<string> {
	const servers = new Set<string>();
	const others = new Set<string>();
	for (const { row, line } of lines)
		if (isServerOnly(line)) servers.add(row.device);
		else if (row.kind !== 'device.enrolled') others.add(row.device);
	for (const device of others) servers.delete(device);
	return servers;
}

function isServerOnly({ envelope: { kind, v } }: Line): boolean {
	return traits(kind, v)?.writer === 'server';
}

/** The file and, for its seal, the canonical text of everything in it but the lines and the seal. */
function parse(text: string): { file: ExportFile; rest: string } {
	let value: unknown;
	try {
		value = JSON.parse(text);
	} catch {
		throw new DeviceError('file.not_ours', { detail: 'not JSON' });
	}
	const file = ExportFile.safeParse(value);
	if (!file.success) {
		const ours = z.safeParse(z.object({ format: z.literal(FORMAT) }), value).success;
		throw new DeviceError(ours ? 'file.damaged' : 'file.not_ours', { cause: file.error });
	}
	const rest = { ...(value as Record<string, Json>) };
	delete rest['lines'];
	delete rest['seal'];
	try {
		return { file: file.data, rest: canonicalText(rest) };
	} catch (error) {
		if (error instanceof NotCanonical) throw new DeviceError('file.damaged', { cause: error });
		throw error;
	}
}

function readLine(text: string, build: string): { row: EntryRow; line: Line } {
	const reading = readEntry(text);
	const line = lineOf(reading);
	const envelope: Envelope | undefined = reading.ok ? reading.entry : reading.envelope;
	if (!line || !envelope || envelope.build !== build)
		throw new DeviceError('file.damaged', { detail: 'a line cannot be read' });
	const { id, n, kind, device, author } = envelope;
	const row: EntryRow = {
		build,
		id,
		part: partOf(envelope),
		n,
		kind,
		device,
		author,
		text,
		hash: hashText(text),
		...(reading.ok && { sound: 1 })
	};
	return { row, line };
}

export interface Imported {
	readonly build: string;
	readonly added: number;
	readonly already: number;
}

/**
 * Takes from a file the lines this store lacks, all or none, in one strict transaction. They go out to the server under
 * the seals in the file, whoever wrote them. A build this store does not know is taken in if the file says that this
 * person is of its crew; it stays read-only until the server has been asked.
 *
 * @throws DeviceError as {@link readExport}; `file.other_build` for a build this person has no part in; `device.full`
 */
export async function importExport(store: DeviceStore, text: string): Promise<Imported> {
	const file = await readExport(text);
	const { build } = file;
	const told = await store.handle.run(async (db) => {
		const tx = writing(
			db,
			['builds', 'entries', 'outbox', 'seals', 'devices', 'summaries'],
			'strict'
		);
		return settled(tx, async () => {
			const row = (await tx.objectStore('builds').get(build)) ?? newcomer(store, file);
			for (const { device, key, person } of await tx.objectStore('devices').getAll(within(build)))
				if (
					(file.keys.get(device) ?? key) !== key ||
					(device !== row.server && (file.persons.get(device) ?? person) !== person)
				)
					throw new DeviceError('file.damaged', {
						detail: 'a device has another key or person in the log'
					});
			const here = await Promise.all(
				file.lines.map(async ({ row: { id } }) => tx.objectStore('entries').get([build, id]))
			);
			const parts = new Map<string, undefined>();
			const now = store.env.now();
			let added = 0;
			file.lines.forEach(({ row: line, line: read, seal }, i) => {
				// Same id, other bytes: ours stays; the server decides when both reach it.
				if (here[i]) return;
				if (isServerOnly(read) && line.device !== (row.server ?? line.device))
					throw new DeviceError('file.damaged', { detail: `${line.id} is not the server's` });
				added++;
				parts.set(line.part, undefined);
				// The lines come in order of n, so only one that leaps away from all before it is left out.
				if (line.n <= row.maxN + N_LEAP) row.maxN = Math.max(row.maxN, line.n);
				const name = sealName(seal);
				const outbox = carriedRow(line, file.states.get(line.id), now);
				const excluded = outbox.state !== 'waiting' && ({ excluded: 1 } as const);
				quiet(tx.objectStore('entries').add({ ...line, seal: name, ...excluded }));
				quiet(tx.objectStore('outbox').put(outbox));
				quiet(tx.objectStore('seals').put({ build, name, ...seal }));
			});
			const before = row.changes;
			const lines = await recount(tx, build, parts);
			if (added > 0) row.changes++;
			row.lines += added;
			quiet(tx.objectStore('builds').put(row));
			return { before, after: row.changes, lines, added };
		});
	});
	if (told.added > 0) {
		store.cache.set(build, told.before, told.after, told.lines);
		store.notices.send({ build, parts: [...told.lines.keys()], appended: true });
	}
	return { build, added: told.added, already: file.lines.length - told.added };
}

const NOT_COUNTED: readonly OutboxState[] = ['refused', 'pending', 'discarded'];

/** What was not counted where it comes from is not counted here either; it is offered all the same. */
function carriedRow(
	{ build, n, id }: EntryRow,
	was: { readonly state: string; readonly code?: string | undefined } | undefined,
	at: number
): OutboxRow {
	const state = NOT_COUNTED.find((name) => name === was?.state) ?? 'waiting';
	const code = state === 'waiting' ? undefined : was?.code;
	return { build, n, id, state, tries: 0, at, carried: true, ...(code !== undefined && { code }) };
}

/** The row for a build that this store gets to know by a file. */
function newcomer(store: DeviceStore, file: ReadExport) {
	const lines = file.lines.map(({ line }) => line);
	const { name, crew } = foldBuild(lines.filter((line) => partOf(line.envelope) === ''));
	const opened = lines.find(({ entry }) => entry?.kind === 'build.opened');
	const role = crew.get(store.person);
	const mine = opened?.envelope.author === store.person || (role !== undefined && role !== 'left');
	if (!mine) throw new DeviceError('file.other_build');
	return newBuildRow(file.build, name);
}
