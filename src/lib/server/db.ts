import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import Sqlite from 'better-sqlite3';
import { CompiledQuery, Kysely, SqliteDialect, SqliteDriver } from 'kysely';
import type { DatabaseConnection, Driver, SqliteDatabase, Transaction } from 'kysely';
import { config } from './config';
import type { Database } from './schema';

export type Db = Kysely<Database>;
export type Trx = Transaction<Database>;

/**
 * A transaction takes SQLite's write lock when it begins. Begun deferred and reading first, it would
 * get SQLITE_BUSY_SNAPSHOT at its first write whenever another process wrote meanwhile, whatever
 * `busy_timeout` says.
 *
 * On a full disk SQLite rolls the transaction back by itself. A statement that followed would then
 * run outside of any transaction and be kept alone, so it is refused; and Kysely's own rollback,
 * which would fail and hide the reason, is left out.
 */
class ImmediateDriver extends SqliteDriver {
	readonly #sqlite: Sqlite.Database;
	#begun = false;

	constructor(sqlite: Sqlite.Database) {
		super({ database: preparing(sqlite) });
		this.#sqlite = sqlite;
	}

	override async acquireConnection(): Promise<DatabaseConnection> {
		const connection = await super.acquireConnection();
		return {
			executeQuery: async <R>(query: CompiledQuery) => {
				if (this.#begun && !this.#sqlite.inTransaction) {
					throw new Error('the transaction has already been rolled back');
				}
				return connection.executeQuery<R>(query);
			},
			streamQuery: <R>(query: CompiledQuery, chunkSize?: number) =>
				connection.streamQuery<R>(query, chunkSize)
		};
	}

	override async beginTransaction(connection: DatabaseConnection): Promise<void> {
		await connection.executeQuery(CompiledQuery.raw('begin immediate'));
		this.#begun = true;
	}

	override async commitTransaction(connection: DatabaseConnection): Promise<void> {
		await super.commitTransaction(connection);
		this.#begun = false;
	}

	override async rollbackTransaction(connection: DatabaseConnection): Promise<void> {
		if (this.#sqlite.inTransaction) await super.rollbackTransaction(connection);
		this.#begun = false;
	}
}

/** Different statements in use; the product has fewer than a hundred. */
const MOST_STATEMENTS = 500;

/**
 * The same SQL is compiled once. What must hold: Kysely runs a statement to its end before it asks for the next, so
 * that one is never in use twice; a list that grew without bound would mean SQL with values written into it.
 */
function preparing(sqlite: Sqlite.Database): SqliteDatabase {
	const prepared = new Map<string, Sqlite.Statement>();
	return {
		prepare(sql) {
			let statement = prepared.get(sql);
			if (!statement) {
				if (prepared.size >= MOST_STATEMENTS) prepared.clear();
				prepared.set(sql, (statement = sqlite.prepare(sql)));
			}
			return statement;
		},
		close() {
			sqlite.close();
		}
	};
}

class ImmediateDialect extends SqliteDialect {
	readonly #sqlite: Sqlite.Database;

	constructor(sqlite: Sqlite.Database) {
		super({ database: sqlite });
		this.#sqlite = sqlite;
	}

	override createDriver(): Driver {
		return new ImmediateDriver(this.#sqlite);
	}
}

/**
 * Opens the database in `file` and creates it if it is not there. `synchronous=FULL`: a committed
 * transaction is on the disk before anybody is told, or an acknowledged line could vanish with the
 * power. The time-out is short because better-sqlite3 waits with the whole process; `write` retries.
 */
export function openDb(file: string): Db {
	const sqlite = new Sqlite(file, { timeout: 1000 });
	sqlite.pragma('journal_mode = WAL');
	sqlite.pragma('synchronous = FULL');
	sqlite.pragma('foreign_keys = ON');
	return new Kysely<Database>({ dialect: new ImmediateDialect(sqlite) });
}

let current: Db | undefined;

/** The one connection of this process; opened at the first call, which the start makes. */
export function getDb(): Db {
	if (current === undefined) {
		const { dataDir } = config();
		// Nobody else on the machine may read the log or the keys.
		mkdirSync(dataDir, { recursive: true, mode: 0o700 });
		current = openDb(join(dataDir, 'tallybar.db'));
	}
	return current;
}

/** Closes the connection; SQLite then folds the write-ahead log back into the file. */
export async function closeDb(): Promise<void> {
	const db = current;
	current = undefined;
	await db?.destroy();
}
