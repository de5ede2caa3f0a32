import { writeEntry } from '$lib/logbook/entry';
import type { Entry } from '$lib/logbook/entry';
import type { Body } from '$lib/logbook/kinds';
import { newId, wallTime } from './id';
import type { Journal } from './journal';
import type { Line } from './offered';
import type { ServerKey } from './server-key';

/** The kinds a person's online action makes the server write. */
type ServerKind = 'crew.joined' | 'crew.role' | 'crew.left' | 'owner.changed' | 'device.enrolled';
export type ServerLine = { [K in ServerKind]: { kind: K; body: Body<K> } }[ServerKind];

/**
 * Writes lines into the log as the device of the build that the server is, in the name of the person who acted.
 * In a build that does not know this device yet (a new one, or one whose server lost its key) it enrols itself first:
 * without its key nobody could check these lines. The crew must be loaded.
 */
export function writeServerLines(
	key: ServerKey,
	journal: Journal,
	author: string,
	lines: readonly ServerLine[]
): void {
	const enrolled = journal.device(key.device) !== undefined;
	const enrolment: ServerLine = {
		kind: 'device.enrolled',
		body: { key: key.publicKey, name: 'server' }
	};
	const written: Line[] = [];
	for (const line of enrolled ? lines : [enrolment, ...lines]) {
		const entry = {
			id: newId(),
			build: journal.build,
			kind: line.kind,
			v: 1,
			on: [],
			n: journal.maxN + 1 + written.length,
			device: key.device,
			author,
			at: wallTime(journal.received),
			body: line.body
		} as Entry;
		const before = written.map((other) => other.entry);
		written.push(write({ ...entry, on: journal.crewHeads(entry, before) }));
	}
	const seal = journal.keepSeal(
		key.makeSeal(
			journal.build,
			written.map((line) => line.hash)
		)
	);
	for (const line of written) journal.append({ ...line, seal });
}

function write(entry: Entry): Line {
	const reading = writeEntry(entry);
	if (!reading.ok) throw new Error(`the server wrote a line it cannot read: ${reading.code}`);
	return reading;
}
