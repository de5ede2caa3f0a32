import { statfs } from 'node:fs/promises';
import { sql } from 'kysely';
import type { Db } from './db';
import { tallybarProcess } from './process';

/** Below this a push with photos may meet a full disk in the middle. */
const LEAST_FREE_BYTES = 64 * 1024 * 1024;

export type Readiness =
	{ ready: true } | { ready: false; reason: 'stopping' | 'disk' | 'database' };

/** Whether this server can take work now: it is not stopping, has room, and can write. */
export async function readiness(db: Db, dataDir: string): Promise<Readiness> {
	if (tallybarProcess().draining) return { ready: false, reason: 'stopping' };
	try {
		const disk = await statfs(dataDir);
		if (disk.bavail * disk.bsize < LEAST_FREE_BYTES) return { ready: false, reason: 'disk' };
		// A transaction here begins by taking the write lock, which a database that is read-only,
		// gone or held by another process does not give.
		await db.transaction().execute((trx) => sql`select 1`.execute(trx));
		return { ready: true };
	} catch {
		return { ready: false, reason: 'database' };
	}
}
