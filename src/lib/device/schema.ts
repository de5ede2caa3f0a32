/**
 * What a device keeps, and where. Only this folder knows these names.
 *
 * Old phones run old code on new stores and new code on old ones: upgrades only ever add stores, indexes and
 * optional fields. Nothing here is renamed, narrowed or given another meaning.
 */
import type { DBSchema, IDBPDatabase, IDBPTransaction, StoreNames } from 'idb';
import type { Role } from '$lib/logbook/kinds';
import type { SeamSummary } from '$lib/logbook/fold/summary';
import type { CrewMember, SignedPlace } from '$lib/logbook/wire';

/** Raised with every additive change; see `upgrade`. */
export const SCHEMA_VERSION = 1;

export interface BuildRow {
	readonly build: string;
	name: string;
	/** As the server last said; null while only this device knows the build, or after leaving it. */
	role: Role | null;
	/**
	 * Which history of the server `seq` and `cursor` belong to. Raised when the server's history changed (a restored
	 * backup): an entry is placed only if it carries this number.
	 */
	history: number;
	/** How far this device has followed the history; the signature is empty where none could be verified. */
	cursor: SignedPlace;
	/** Highest n known. Raised inside the transaction that adds a line, so no two lines of a device share one. */
	maxN: number;
	/** Number of the server's last line when it was last asked. */
	head: number;
	/** All lines here, also those not placed; `lines - cursor.seq` of them are not placed. */
	lines: number;
	/** Raised by every transaction that changes what a fold would see; makes copies in memory checkable. */
	changes: number;
	/** Devices of this store that have enrolled in this build. */
	enrolled: string[];
	/** The server's history changed: what it lacks is offered again until nothing lacks. */
	reoffer: boolean;
	/** The server said "no longer in the crew". Read-only, not pulled. */
	removed: boolean;
	/** The server has listed it or answered for it at least once. */
	known: boolean;
	/** Device of the server in this build, once its key was seen to fit a place it signed. */
	server?: string;
	/** When a round last brought this build to its head, in ms since 1970. */
	lastSuccess?: number;
	/** Lines the owner has to decide on, by the last list. */
	quarantined?: number;
}

export type LineFinding =
	/** No seal of its device fits it. */
	| 'seal.broken'
	| 'seal.missing'
	/** A second enrolment of a device with another key. */
	| 'device.other_key'
	/** The device that wrote it is not enrolled. */
	| 'device.unknown'
	/** The device that wrote it is enrolled for somebody else than its author, or is not the server's for a line only that writes. */
	| 'device.other_person'
	/** Another line of this id was here, with other bytes; it is in `conflict`. */
	| 'entry.id_conflict';

export interface EntryRow {
	readonly build: string;
	readonly id: string;
	/** The seam, or '' for lines that concern none. */
	readonly part: string;
	readonly n: number;
	readonly kind: string;
	readonly device: string;
	readonly author: string;
	/** The canonical text, never rewritten. Empty when the body was withdrawn. */
	text: string;
	readonly hash: string;
	/** This app understood it when it was stored, so the text need not be judged again. */
	sound?: 1;
	seq?: number;
	received?: number;
	/** The history `seq` belongs to. */
	history?: number;
	/** Name of a stored seal of its device that names its hash. */
	seal?: string;
	/** Refused, pending or discarded: visible, not counted. */
	excluded?: 1;
	finding?: LineFinding;
	withdrawn?: { readonly envelope: string; readonly by: string };
	conflict?: { readonly text: string; readonly hash: string };
}

/**
 * waiting: not yet with the server. acknowledged: on the server's disk, not yet seen in a pull. held: on its disk, waits
 * for a line it refers to. pending: in quarantine. refused, discarded: see the code. parked: the server failed on it
 * alone; it is tried again later.
 */
export type OutboxState =
	'waiting' | 'acknowledged' | 'held' | 'pending' | 'refused' | 'discarded' | 'parked';

export interface OutboxRow {
	readonly build: string;
	readonly n: number;
	readonly id: string;
	state: OutboxState;
	code?: string;
	/** Offers that did not settle it. */
	tries: number;
	/** Not before this time, in ms since 1970. */
	due?: number;
	/** When it was put here. */
	readonly at: number;
	/** Brought by a file, not written here; goes out under the stored seal. */
	readonly carried?: true;
	/**
	 * The log has another line under this id. Ours is in that row's `conflict`, the only copy there is: not offered any
	 * more, but counted as unsent until the person has let it go.
	 */
	replaced?: true;
}

export interface SealRow {
	readonly build: string;
	readonly name: string;
	readonly device: string;
	readonly hashes: readonly string[];
	readonly signature: string;
}

/** A device enrolled in a build. The first enrolment holds. */
export interface DeviceRow {
	readonly build: string;
	readonly device: string;
	readonly key: string;
	readonly person: string;
	readonly line: string;
}

/** A place the server signed, in the current history. At most 1000 lines from the next, so proofs fit a message. */
interface WaypointRow extends SignedPlace {
	readonly build: string;
	readonly history: number;
}

/** A stretch of a history the server no longer has: from a place, so many lines, to a place it signed. */
export interface FormerRow {
	readonly build: string;
	readonly history: number;
	/** Sequence number and link before the first row. */
	readonly from: number;
	readonly link: string;
	readonly rows: readonly (readonly [received: number, hash: string, id: string])[];
	readonly signature: string;
}

interface SummaryRow {
	readonly build: string;
	readonly seam: string;
	readonly fold: number;
	readonly summary: SeamSummary;
}

export interface OwnKeys {
	readonly device: string;
	readonly pair: CryptoKeyPair;
	readonly publicKey: string;
}

/** What stands in `meta`, by key. `keys:<device>` are kept for ever: lines of an older device may still need a seal. */
type Meta =
	| { readonly is: 'device'; readonly device: string }
	| { readonly is: 'keys'; readonly keys: OwnKeys }
	| { readonly is: 'persisted'; readonly granted: boolean; readonly at: number }
	| { readonly is: 'crew'; readonly crew: readonly CrewMember[] }
	/** Of a build that was made here in one go: its highest n then. What was written since is beyond it. */
	| { readonly is: 'made'; readonly maxN: number };

export interface Schema extends DBSchema {
	meta: { key: string; value: Meta };
	builds: { key: string; value: BuildRow };
	entries: {
		key: [string, string];
		value: EntryRow;
		indexes: { byPart: [string, string, number]; byN: [string, number] };
	};
	outbox: {
		key: [string, number, string];
		value: OutboxRow;
		indexes: { byState: [string, string, number] };
	};
	seals: { key: [string, string]; value: SealRow };
	devices: { key: [string, string]; value: DeviceRow };
	summaries: { key: [string, string]; value: SummaryRow };
	waypoints: { key: [string, number, number]; value: WaypointRow };
	former: { key: [string, number, number]; value: FormerRow };
	drafts: { key: string; value: { readonly key: string; readonly json: string } };
}

export type Database = IDBPDatabase<Schema>;
export type StoreName = StoreNames<Schema>;
export type Transaction<
	Names extends StoreName = StoreName,
	Mode extends IDBTransactionMode = 'readonly'
> = IDBPTransaction<Schema, Names[], Mode>;

export const ALL_STORES: StoreName[] = [
	'meta',
	'builds',
	'entries',
	'outbox',
	'seals',
	'devices',
	'summaries',
	'waypoints',
	'former',
	'drafts'
];

/** Additive only. A store that exists is left as it is. */
export function upgrade(db: Database, from: number): void {
	if (from >= 1) return;
	db.createObjectStore('meta');
	db.createObjectStore('builds', { keyPath: 'build' });
	const entries = db.createObjectStore('entries', { keyPath: ['build', 'id'] });
	entries.createIndex('byPart', ['build', 'part', 'n']);
	entries.createIndex('byN', ['build', 'n']);
	const outbox = db.createObjectStore('outbox', { keyPath: ['build', 'n', 'id'] });
	outbox.createIndex('byState', ['build', 'state', 'n']);
	db.createObjectStore('seals', { keyPath: ['build', 'name'] });
	db.createObjectStore('devices', { keyPath: ['build', 'device'] });
	db.createObjectStore('summaries', { keyPath: ['build', 'seam'] });
	db.createObjectStore('waypoints', { keyPath: ['build', 'history', 'seq'] });
	db.createObjectStore('former', { keyPath: ['build', 'history', 'from'] });
	db.createObjectStore('drafts', { keyPath: 'key' });
}

/** Everything of a build (or of a build and one more step of the key). */
export function within(...key: (string | number)[]): IDBKeyRange {
	// An array sorts after every text and number, so [key, []] lies behind all keys that begin with `key`.
	return IDBKeyRange.bound(key, [...key, []]);
}
