import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import fc from 'fast-check';
import { sql } from 'kysely';
import { expect, it } from 'vitest';
import { openDb } from '$lib/server/db';
import { write } from '$lib/server/write';

it('numbers given inside write have no gap and no double, whichever writes fail', async () => {
	const folder = mkdtempSync(join(tmpdir(), 'tallybar-write-'));
	const db = openDb(join(folder, 'tallybar.db'));
	await sql`create table line (seq integer primary key, writer integer not null)`.execute(db);
	try {
		await fc.assert(
			fc.asyncProperty(fc.array(fc.boolean(), { maxLength: 20 }), async (fails) => {
				await sql`delete from line`.execute(db);
				const results = await Promise.allSettled(
					fails.map((fail, writer) =>
						write(db, async (trx) => {
							const { rows } = await sql<{
								next: number;
							}>`select coalesce(max(seq), 0) + 1 as next from line`.execute(trx);
							await sql`insert into line values (${rows[0]?.next}, ${writer})`.execute(trx);
							if (fail) throw new Error('refused');
						})
					)
				);
				expect(results.map((result) => result.status === 'rejected')).toEqual(fails);
				const { rows } = await sql<{ seq: number }>`select seq from line order by seq`.execute(db);
				const kept = fails.filter((fail) => !fail).length;
				expect(rows.map((row) => row.seq)).toEqual(Array.from({ length: kept }, (_, i) => i + 1));
			}),
			{ numRuns: 100 }
		);
	} finally {
		await db.destroy();
		rmSync(folder, { recursive: true });
	}
});
