import { mkdtempSync, readdirSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import Sqlite from 'better-sqlite3';
import { sql } from 'kysely';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { openDb } from './db';
import type { Db, Trx } from './db';
import { migrate } from './migrate';
import { DiskFullError, write } from './write';

let folder: string;
let file: string;
let db: Db;

beforeEach(async () => {
	folder = mkdtempSync(join(tmpdir(), 'tallybar-db-'));
	file = join(folder, 'tallybar.db');
	db = openDb(file);
	await sql`create table line (n integer primary key, text text not null) strict`.execute(db);
});

afterEach(async () => {
	await db.destroy();
	rmSync(folder, { recursive: true });
});

async function one(query: string): Promise<unknown> {
	const { rows } = await sql<Record<string, unknown>>`${sql.raw(query)}`.execute(db);
	return Object.values(rows[0] ?? {})[0];
}

const add = (trx: Trx, n: number, text = '') =>
	sql`insert into line values (${n}, ${text})`.execute(trx);

describe('the database', () => {
	it('keeps what it acknowledges: synchronous is FULL on the live connection', async () => {
		expect(await one('pragma synchronous')).toBe(2);
		expect(await one('pragma journal_mode')).toBe('wal');
		expect(await one('pragma foreign_keys')).toBe(1);
		expect(await one('pragma busy_timeout')).toBe(1000);
	});
});

describe('write', () => {
	it('runs writes one after the other, in the order they were asked for', async () => {
		const seen: string[] = [];
		await Promise.all(
			[1, 2, 3].map((n) =>
				write(db, async (trx) => {
					seen.push(`begin ${n}`);
					await add(trx, n);
					await new Promise((done) => setImmediate(done));
					seen.push(`end ${n}`);
				})
			)
		);
		expect(seen).toEqual(['begin 1', 'end 1', 'begin 2', 'end 2', 'begin 3', 'end 3']);
	});

	it('keeps nothing of a write that fails, and goes on with the next', async () => {
		const failing = write(db, async (trx) => {
			await add(trx, 1);
			throw new Error('refused');
		});
		const next = write(db, (trx) => add(trx, 2));
		await expect(failing).rejects.toThrow('refused');
		await next;
		expect(await one('select group_concat(n) from line')).toBe('2');
	});

	it('holds the write lock from its first statement on, even a read', async () => {
		const other = new Sqlite(file, { timeout: 0 });
		try {
			await write(db, async (trx) => {
				await sql`select 1 from line`.execute(trx);
				expect(() => other.exec('begin immediate')).toThrow('database is locked');
			});
		} finally {
			other.close();
		}
	});

	it('runs the whole transaction again when another process held the lock', async () => {
		const other = new Sqlite(file);
		other.exec('begin immediate');
		const release = setTimeout(() => other.exec('commit'), 1100);
		try {
			await write(db, (trx) => add(trx, 1));
			expect(await one('select count(*) from line')).toBe(1);
		} finally {
			clearTimeout(release);
			other.close();
		}
	});

	it('says by name that the disk is full, and keeps nothing of that write', async () => {
		await sql`pragma max_page_count = 4`.execute(db);
		const tooMuch = write(db, async (trx) => {
			await add(trx, 1, 'small');
			await add(trx, 2, 'x'.repeat(100_000));
		});
		await expect(tooMuch).rejects.toThrow(DiskFullError);
		expect(await one('select count(*) from line')).toBe(0);
	});

	it('keeps no later statement of a write that the full disk has already rolled back', async () => {
		await sql`pragma max_page_count = 4`.execute(db);
		const goingOn = write(db, async (trx) => {
			await add(trx, 1, 'x'.repeat(100_000)).catch(() => undefined);
			await add(trx, 2, 'small');
		});
		await expect(goingOn).rejects.toThrow('already been rolled back');
		expect(await one('select count(*) from line')).toBe(0);
		await write(db, (trx) => add(trx, 3, 'small'));
		expect(await one('select count(*) from line')).toBe(1);
	});

	it('refuses a write inside a write instead of waiting for itself for ever', async () => {
		const nested = write(db, () => write(db, (trx) => add(trx, 1)));
		await expect(nested).rejects.toThrow('pass trx down');
	});
});

describe('migrate', () => {
	const make = (table: string) => ({
		up: async (at: Db) => {
			await at.transaction().execute((trx) => sql.raw(`create table ${table} (n)`).execute(trx));
		}
	});

	it('applies what is missing, once, and copies an older database before it does', async () => {
		const backups = join(folder, 'backups');
		const first = { '2026-01-01-a': make('a') };
		expect(await migrate(db, backups, first)).toEqual(['2026-01-01-a']);
		expect(await migrate(db, backups, first)).toEqual([]);
		const both = { ...first, '2026-02-01-b': make('b') };
		expect(await migrate(db, backups, both)).toEqual(['2026-02-01-b']);
		expect(readdirSync(backups)).toEqual([expect.stringMatching(/^before-2026-02-01-b-.*\.db$/)]);
	});

	it('throws when a migration fails, and names it', async () => {
		const broken = { '2026-01-01-broken': make('line') };
		await expect(migrate(db, folder, broken)).rejects.toThrow(
			/2026-01-01-broken: .*already exists/
		);
	});

	it('refuses a database that a newer version has written', async () => {
		await migrate(db, folder, { '2026-01-01-a': make('a'), '2026-02-01-b': make('b') });
		await expect(migrate(db, folder, { '2026-01-01-a': make('a') })).rejects.toThrow(
			'cannot be used by this version'
		);
	});

	it('brings an empty database to the newest version with the migrations of this repository', async () => {
		const fresh = openDb(join(folder, 'fresh.db'));
		const names = await migrate(fresh, folder);
		await fresh.destroy();
		expect(names).toEqual([...names].sort());
		for (const name of names) expect(name).toMatch(/^\d{4}-\d\d-\d\d-[a-z0-9-]+$/);
	});
});
