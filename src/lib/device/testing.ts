/** For tests only: many devices in one process. The database is `fake-indexeddb`, imported by each test file. */
import type { Draft } from './append';
import { appendEntries } from './append';
import { openStore, type DeviceStore, type StoreOptions } from './store';

let devices = 0;

/** A device of its own for this person, with a name nobody else in the process has. */
export function newDevice(person: string, options: StoreOptions = {}): Promise<DeviceStore> {
	return openStore(person, { prefix: `device ${++devices}: `, ...options });
}

/** A build with one assembly and one seam, opened on this device. */
export async function openBuild(store: DeviceStore, holes = 20) {
	const build = store.newId();
	const assembly = store.newId();
	const seam = store.newId();
	await appendEntries(store, build, [
		{ id: build, kind: 'build.opened', body: { name: 'Test build' } },
		{ id: assembly, kind: 'assembly.planned', assembly, body: { name: 'Left wing' } },
		planned(seam, assembly, holes)
	]);
	return { build, assembly, seam };
}

export function planned(seam: string, assembly: string, holes = 20): Draft<'seam.planned'> {
	return {
		id: seam,
		kind: 'seam.planned',
		seam,
		body: { name: 'Rear spar', assembly, holes: { count: holes, first: 1 } }
	};
}

export function driven(seam: string, from: number, to = from): Draft<'holes.driven'> {
	return { kind: 'holes.driven', seam, body: { holes: [{ from, to }], method: 'driven' } };
}
