import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import { Migrator, sql } from 'kysely';
import type { Migration } from 'kysely';
import type { Db } from './db';

/** Part of the build, so that a built server brings its own migrations with it. */
const bundled = import.meta.glob<Migration>('/migrations/*.ts', { eager: true });

/** The migrations by name: `migrations/2026-12-01-accounts.ts` is `2026-12-01-accounts`. */
function bundledMigrations(): Record<string, Migration> {
	return Object.fromEntries(
		Object.entries(bundled).map(([path, migration]) => [
			path.replace(/^\/migrations\//, '').replace(/\.ts$/, ''),
			migration
		])
	);
}

/**
 * Brings the database to the newest version and returns the names of what was applied. A database
 * that already holds lines is copied to `backupDir` first.
 *
 * Throws when a migration fails or when the database was written by a newer Tallybar; the server
 * must then not start. On SQLite Kysely gives migrations no transaction: each opens its own.
 */
export async function migrate(
	db: Db,
	backupDir: string,
	migrations: Record<string, Migration> = bundledMigrations()
): Promise<string[]> {
	const migrator = new Migrator({
		db,
		provider: { getMigrations: () => Promise.resolve(migrations) }
	});
	const known = await migrator.getMigrations();
	const pending = known.filter((migration) => migration.executedAt === undefined);
	const [first] = pending;
	if (first !== undefined && pending.length < known.length) {
		mkdirSync(backupDir, { recursive: true, mode: 0o700 });
		const stamp = new Date().toISOString().replace(/[:.]/g, '-');
		await sql`vacuum into ${join(backupDir, `before-${first.name}-${stamp}.db`)}`.execute(db);
	}
	const { error, results = [] } = await migrator.migrateToLatest();
	if (error !== undefined) {
		const failed = results.find((result) => result.status === 'Error')?.migrationName;
		const reason = error instanceof Error ? error.message : 'an unknown error';
		throw new Error(
			failed === undefined
				? `the database cannot be used by this version: ${reason}`
				: `the database could not be brought up to date by ${failed}: ${reason}`,
			{ cause: error }
		);
	}
	return results.map((result) => result.migrationName);
}
