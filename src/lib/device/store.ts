/** The store of one person on one device: opening it, its keys, and what every use of it shares. */
import { idMaker } from '$lib/logbook/id';
import { makeKeys, publicKeyText } from '$lib/logbook/seal';
import { DEVICE, type DeviceEnv } from './clock';
import { Handle, quiet } from './handle';
import { LineCache } from './lines';
import { Notices, type Notice } from './notices';
import { rememberPerson } from './registry';
import { SCHEMA_VERSION, upgrade, type Database, type OwnKeys, type Schema } from './schema';

export interface StoreOptions {
	/** Before every database name: many devices in one process, for tests. */
	readonly prefix?: string;
	/** What the person is called, for the registry. */
	readonly name?: string;
	/** Stands in `device.enrolled`, at most 60 characters. */
	readonly deviceName?: string;
	readonly env?: Partial<DeviceEnv>;
}

/** What the browser promised about keeping the store. `asked: false`: nothing was saved yet. */
export type Persistence = { readonly asked: false } | { readonly asked: true; granted: boolean };

export class DeviceStore {
	/** A new id, greater than all before it from this store. */
	readonly newId: () => string;
	readonly cache = new LineCache();
	#keys: OwnKeys;
	#persistence: Persistence = { asked: false };

	constructor(
		readonly person: string,
		readonly prefix: string,
		readonly deviceName: string | undefined,
		readonly env: DeviceEnv,
		readonly handle: Handle<Schema>,
		readonly notices: Notices,
		keys: OwnKeys,
		/** Nothing of it is ever put in line for a server, and the browser is not asked to keep it. */
		readonly stays = false
	) {
		this.newId = idMaker(env.now, env.chance);
		this.#keys = keys;
		notices.subscribe(({ device }) => {
			// Another tab made a new device; writing on as the old one would go on doubling its numbers.
			if (device !== undefined && device !== this.#keys.device) void this.#takeKeys(device);
		});
	}

	/** The device this store writes as, and its key. */
	get keys(): OwnKeys {
		return this.#keys;
	}
	get device(): string {
		return this.#keys.device;
	}
	get persistence(): Persistence {
		return this.#persistence;
	}

	/** Hears of every committed change, of this tab and others. @returns the function that stops it */
	subscribe(listener: (notice: Notice) => void): () => void {
		return this.notices.subscribe(listener);
	}

	/** Lets go of the database and the channel. The store can be opened again. */
	close(): void {
		this.notices.close();
		this.handle.dispose();
	}

	/**
	 * A new device id and key pair, after the server saw two stores use this one's (a copied profile). Lines written as
	 * the old device stay what they are; its key is kept to seal them.
	 */
	async mintDevice(): Promise<string> {
		const keys = await newKeys(this.newId);
		await this.handle.run(async (db) => {
			const tx = db.transaction('meta', 'readwrite', { durability: 'strict' });
			quiet(tx.store.put({ is: 'keys', keys }, `keys:${keys.device}`));
			quiet(tx.store.put({ is: 'device', device: keys.device }, 'device'));
			await tx.done;
		});
		this.#keys = keys;
		this.notices.send({ parts: [], device: keys.device });
		return keys.device;
	}

	/** The keys of a device of this store, present or former. */
	async keysOf(device: string): Promise<OwnKeys | undefined> {
		if (device === this.#keys.device) return this.#keys;
		const meta = await this.handle.run((db) => db.get('meta', `keys:${device}`));
		return meta?.is === 'keys' ? meta.keys : undefined;
	}

	/**
	 * Asks the browser, once, to keep this store when room is short. Called at the first saved line: some browsers only
	 * say yes when something worth keeping is there. What it answered is in {@link persistence}.
	 */
	async askToPersist(): Promise<void> {
		if (this.#persistence.asked) return;
		const storage = (globalThis as { navigator?: { storage?: Partial<StorageManager> } }).navigator
			?.storage;
		if (!storage?.persist) return;
		this.#persistence = { asked: true, granted: false };
		try {
			const granted = await storage.persist();
			this.#persistence = { asked: true, granted };
			await this.handle.run((db) =>
				db.put('meta', { is: 'persisted', granted, at: this.env.now() }, 'persisted')
			);
		} catch {
			// A browser without an answer has promised nothing.
		}
	}

	async recallPersistence(): Promise<void> {
		const meta = await this.handle.run((db) => db.get('meta', 'persisted'));
		// A refusal is asked again at the next start: a browser that knows the page better may agree.
		if (meta?.is === 'persisted' && meta.granted)
			this.#persistence = { asked: true, granted: true };
	}

	async #takeKeys(device: string): Promise<void> {
		const meta = await this.handle.run((db) => db.get('meta', `keys:${device}`));
		if (meta?.is === 'keys') this.#keys = meta.keys;
	}
}

/**
 * Opens the store of a person on this device, and makes it and its keys when there is none.
 * @throws DeviceError `device.store_closed` when the browser does not open it (never a silent copy in memory:
 *   what is logged there would be gone with the tab), `device.full` when there is no room
 */
export async function openStore(person: string, options: StoreOptions = {}): Promise<DeviceStore> {
	const { prefix = '', name } = options;
	const store = await openNamed(storeName(person, prefix), person, options, false);
	try {
		const { env } = store;
		await rememberPerson({ person, ...(name !== undefined && { name }) }, { prefix, env });
		return store;
	} catch (error) {
		store.close();
		throw error;
	}
}

/**
 * Opens a store that stays: of no account, in no list of who is here, and never the one that is signed in.
 * @param name of the store among those that stay
 * @param person as whom lines are written in it
 */
export function openStayingStore(
	name: string,
	person: string,
	options: StoreOptions = {}
): Promise<DeviceStore> {
	// Ids of persons have no space, so no account's store is called this.
	return openNamed(storeName(`stays ${name}`, options.prefix ?? ''), person, options, true);
}

async function openNamed(
	database: string,
	person: string,
	{ prefix = '', deviceName, env: given }: StoreOptions,
	stays: boolean
): Promise<DeviceStore> {
	const env: DeviceEnv = { ...DEVICE, ...given };
	const handle = new Handle<Schema>(database, SCHEMA_VERSION, upgrade);
	try {
		const keys = await handle.run((db) => ownKeys(db, idMaker(env.now, env.chance)));
		const notices = new Notices(database);
		const store = new DeviceStore(person, prefix, deviceName, env, handle, notices, keys, stays);
		await store.recallPersistence();
		return store;
	} catch (error) {
		handle.dispose();
		throw error;
	}
}

export function storeName(person: string, prefix: string): string {
	return `${prefix}tallybar.${person}`;
}

async function ownKeys(db: Database, newId: () => string): Promise<OwnKeys> {
	const there = await keysIn(db);
	if (there) return there;
	// Made before the transaction, which ends by itself while anything else is awaited.
	const made = await newKeys(newId);
	const tx = db.transaction('meta', 'readwrite', { durability: 'strict' });
	// Another tab may have been faster: the first pair stays.
	const current = await tx.store.get('device');
	if (!current) {
		quiet(tx.store.put({ is: 'keys', keys: made }, `keys:${made.device}`));
		quiet(tx.store.put({ is: 'device', device: made.device }, 'device'));
	}
	await tx.done;
	return (await keysIn(db)) ?? made;
}

async function keysIn(db: Database): Promise<OwnKeys | undefined> {
	const current = await db.get('meta', 'device');
	if (current?.is !== 'device') return undefined;
	const meta = await db.get('meta', `keys:${current.device}`);
	return meta?.is === 'keys' ? meta.keys : undefined;
}

async function newKeys(newId: () => string): Promise<OwnKeys> {
	const pair = await makeKeys();
	return { device: newId(), pair, publicKey: await publicKeyText(pair.publicKey) };
}
