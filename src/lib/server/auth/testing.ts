import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { openDb } from '../db';
import type { Db } from '../db';
import { migrate } from '../migrate';

/** A database in a file of its own, with all migrations, for tests. `close` removes it. */
export async function temporaryDb(): Promise<{ db: Db; file: string; close: () => Promise<void> }> {
	const folder = mkdtempSync(join(tmpdir(), 'tallybar-auth-'));
	const file = join(folder, 'tallybar.db');
	const db = openDb(file);
	await migrate(db, join(folder, 'backups'));
	const close = async () => {
		await db.destroy();
		rmSync(folder, { recursive: true });
	};
	return { db, file, close };
}
