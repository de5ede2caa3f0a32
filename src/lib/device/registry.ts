/** Whose stores are on this device, and who was last signed in: known before and without any network. */
import type { DBSchema } from 'idb';
import { DEVICE, type DeviceEnv } from './clock';
import { Handle, quiet } from './handle';

export interface PersonRow {
	readonly person: string;
	name: string;
	/** closed: signed out with lines still in the store; opened again by signing in. */
	state: 'open' | 'closed';
	/** Last signed in or opened, in ms since 1970. */
	lastSeen: number;
}

interface RegistrySchema extends DBSchema {
	persons: { key: string; value: PersonRow };
	/** `last`: the person last signed in, '' after signing out. */
	meta: { key: string; value: string };
}

export interface RegistryOptions {
	readonly prefix?: string;
	readonly env?: Pick<DeviceEnv, 'now'>;
}

async function inRegistry<T>(
	prefix: string,
	work: Parameters<Handle<RegistrySchema>['run']>[0] extends (db: infer D) => Promise<unknown>
		? (db: D) => Promise<T>
		: never
): Promise<T> {
	// Opened for each use: it is read once a visit, and an open connection would only be in the way of upgrades.
	const handle = new Handle<RegistrySchema>(`${prefix}tallybar`, 1, (db, from) => {
		if (from >= 1) return;
		db.createObjectStore('persons', { keyPath: 'person' });
		db.createObjectStore('meta');
	});
	try {
		return await handle.run(work);
	} finally {
		handle.dispose();
	}
}

/** Notes that this person has a store here, open, and is the one signed in. */
export async function rememberPerson(
	{ person, name }: { readonly person: string; readonly name?: string },
	{ prefix = '', env = DEVICE }: RegistryOptions = {}
): Promise<void> {
	await inRegistry(prefix, async (db) => {
		const tx = db.transaction(['persons', 'meta'], 'readwrite');
		const persons = tx.objectStore('persons');
		const there = await persons.get(person);
		quiet(
			persons.put({
				person,
				name: name ?? there?.name ?? '',
				state: 'open',
				lastSeen: env.now()
			})
		);
		quiet(tx.objectStore('meta').put(person, 'last'));
		await tx.done;
	});
}

/** Everybody with a store on this device, open ones first, then the last seen. */
export async function personsHere({ prefix = '' }: RegistryOptions = {}): Promise<PersonRow[]> {
	const rows = await inRegistry(prefix, (db) => db.getAll('persons'));
	return rows.sort(
		(a, b) => Number(a.state === 'closed') - Number(b.state === 'closed') || b.lastSeen - a.lastSeen
	);
}

/** Who was last signed in and has not signed out. Holds offline, and after a session has expired. */
export async function lastPerson({ prefix = '' }: RegistryOptions = {}): Promise<
	PersonRow | undefined
> {
	return inRegistry(prefix, async (db) => {
		const last = await db.get('meta', 'last');
		const row = last ? await db.get('persons', last) : undefined;
		return row?.state === 'open' ? row : undefined;
	});
}

/** Marks a store closed, or forgets it (`gone`), and that its person is signed in. */
export async function dismissPerson(
	person: string,
	to: 'closed' | 'gone',
	{ prefix = '' }: RegistryOptions = {}
): Promise<void> {
	await inRegistry(prefix, async (db) => {
		const tx = db.transaction(['persons', 'meta'], 'readwrite');
		const persons = tx.objectStore('persons');
		const row = await persons.get(person);
		if (to === 'gone') quiet(persons.delete(person));
		else if (row) quiet(persons.put({ ...row, state: 'closed' }));
		const last = await tx.objectStore('meta').get('last');
		if (last === person) quiet(tx.objectStore('meta').put('', 'last'));
		await tx.done;
	});
}
