/**
 * People, their devices and the lines they write, for tests and the bench: real keys, real seals, canonical texts.
 */
import { canonicalText, tidy } from '../../src/lib/logbook/bytes';
import { start } from '../../src/lib/logbook/chain';
import type { Place } from '../../src/lib/logbook/chain';
import { writeEntry } from '../../src/lib/logbook/entry';
import { idMaker } from '../../src/lib/logbook/id';
import type { Body, Kind } from '../../src/lib/logbook/kinds';
import { makeKeys, makeSeal, publicKeyText } from '../../src/lib/logbook/seal';
import type { Seal } from '../../src/lib/logbook/seal';
import type { Proof, PushRequest } from '../../src/lib/logbook/wire';

export const makeId = idMaker(Date.now, (bytes) => crypto.getRandomValues(bytes));

/** A device of one person, with its key; it counts n by itself, like a real one. */
export interface TestDevice {
	readonly device: string;
	readonly author: string;
	readonly keys: CryptoKeyPair;
	readonly publicKey: string;
	n: number;
}

export async function makeDevice(author = makeId()): Promise<TestDevice> {
	const keys = await makeKeys();
	return { device: makeId(), author, keys, publicKey: await publicKeyText(keys.publicKey), n: 0 };
}

export interface TestLine {
	readonly id: string;
	readonly n: number;
	readonly text: string;
	readonly hash: string;
}

/** The parts of the envelope a test may want to choose. */
export interface LineParts {
	readonly id?: string;
	readonly seam?: string;
	readonly assembly?: string;
	readonly on?: readonly string[];
	/** The device counts on from it. */
	readonly n?: number;
	readonly author?: string;
	readonly at?: string;
}

/** A sound line of this device. @throws when the logbook would not take it */
export function writeLine<K extends Kind>(
	device: TestDevice,
	build: string,
	kind: K,
	body: Body<K>,
	{ n = device.n + 1, ...parts }: LineParts = {}
): TestLine {
	if (n < 1e9) device.n = n;
	const entry = {
		id: makeId(),
		build,
		kind,
		v: 1,
		on: [] as string[],
		n,
		device: device.device,
		author: device.author,
		at: '2026-12-01T21:40:05.120+01:00',
		body,
		...parts
	};
	const reading = writeEntry(entry as unknown as Parameters<typeof writeEntry>[0]);
	if (!reading.ok) throw new Error(`not a sound line: ${reading.code} ${kind}`);
	return { id: entry.id, n, text: reading.text, hash: reading.hash };
}

/** The same line with some of its fields changed, sound or not. Its hash is that of its text. */
export function withFields(
	line: TestLine,
	fields: Readonly<Record<string, unknown>>
): Pick<TestLine, 'id' | 'text'> {
	const entry = { ...(JSON.parse(line.text) as { id: string }), ...fields };
	return { id: entry.id, text: canonicalText(tidy(entry)) };
}

/** What begins every build: its first line and the enrolment of the device that opens it. */
export function openBuild(device: TestDevice, name = 'Yarrow of the tests') {
	const build = makeId();
	const opened = writeLine(device, build, 'build.opened', { name }, { id: build });
	return { build, opened, enrolled: enrol(device, build) };
}

export function enrol(device: TestDevice, build: string): TestLine {
	return writeLine(device, build, 'device.enrolled', { key: device.publicKey });
}

/** An assembly and a seam of it with holes 1 to `count`. */
export function planSeam(device: TestDevice, build: string, count = 100) {
	const [assembly, seam] = [makeId(), makeId()];
	const lines = [
		writeLine(device, build, 'assembly.planned', { name: 'Left wing' }, { id: assembly, assembly }),
		writeLine(
			device,
			build,
			'seam.planned',
			{ name: 'Rear spar', assembly, holes: { count, first: 1 } },
			{ id: seam, seam }
		)
	];
	return { assembly, seam, lines };
}

/** One run of driven holes on a seam. */
export function driveHoles(
	device: TestDevice,
	build: string,
	seam: string,
	from: number,
	to = from,
	parts: LineParts = {}
): TestLine {
	return writeLine(
		device,
		build,
		'holes.driven',
		{ holes: [{ from, to }], method: 'driven' },
		{ seam, ...parts }
	);
}

export function sealLines(
	{ device, keys }: TestDevice,
	build: string,
	lines: readonly Pick<TestLine, 'hash'>[]
): Promise<Seal> {
	return makeSeal(
		keys.privateKey,
		build,
		device,
		lines.map((line) => line.hash)
	);
}

/** A push as a device makes it: its own seal over the whole batch, and others' seals beside it. */
export async function sealedPush(
	carrier: TestDevice,
	build: string,
	lines: readonly Pick<TestLine, 'text' | 'hash'>[],
	more: { cursor?: Place; seals?: readonly Seal[]; proofs?: Proof[] } = {}
): Promise<PushRequest> {
	const own = lines.length > 0 ? [await sealLines(carrier, build, lines)] : [];
	return {
		device: carrier.device,
		cursor: more.cursor ?? start(build),
		sentAt: '2026-12-01T21:40:06.000+01:00',
		entries: lines.map((line) => line.text),
		seals: [...own, ...(more.seals ?? [])].map((seal) => ({ ...seal, hashes: [...seal.hashes] })),
		...(more.proofs && { proofs: more.proofs })
	};
}
