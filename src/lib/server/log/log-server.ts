import { config } from '../config';
import { getDb } from '../db';
import type { Db } from '../db';
import { Live } from './live';
import { openServerKey } from './server-key';
import type { ServerKey } from './server-key';

/** What every function of the log stands on. */
export interface LogServer {
	readonly db: Db;
	readonly key: ServerKey;
	readonly live: Live;
}

let current: LogServer | undefined;

/** The log of this process. */
export function getLog(): LogServer {
	if (current === undefined) {
		const db = getDb();
		current = { db, key: openServerKey(config().dataDir), live: new Live(db) };
	}
	return current;
}
