import { sql } from 'kysely';
import type { Kysely } from 'kysely';

/** People, their sessions, and the counters that slow down guessing. Times are milliseconds since 1970. */
export async function up(db: Kysely<any>): Promise<void> {
	await db.transaction().execute(async (trx) => {
		await trx.schema
			.createTable('person')
			.addColumn('id', 'text', (column) => column.primaryKey().notNull())
			// As typed, for letters and screens.
			.addColumn('email', 'text', (column) => column.notNull())
			// Trimmed, NFC, lower case: what makes two spellings one account. SQLite's own NOCASE knows
			// ASCII only, so the form is made by the app and stored.
			.addColumn('email_key', 'text', (column) => column.notNull().unique())
			.addColumn('name', 'text', (column) => column.notNull())
			.addColumn('password_hash', 'text', (column) => column.notNull())
			.addColumn('created', 'integer', (column) => column.notNull())
			.modifyEnd(sql`strict`)
			.execute();

		await trx.schema
			.createTable('session')
			// SHA-256 of the token in the cookie: who reads the database, or a backup of it, cannot sign in.
			.addColumn('id', 'text', (column) => column.primaryKey().notNull())
			.addColumn('person_id', 'text', (column) =>
				column.notNull().references('person.id').onDelete('cascade')
			)
			// The absolute limit counts from here; `expires` slides, but never beyond it.
			.addColumn('created', 'integer', (column) => column.notNull())
			.addColumn('expires', 'integer', (column) => column.notNull())
			.modifyEnd(sql`strict`)
			.execute();
		// A password change ends all sessions of a person; without it each would read every session.
		await trx.schema.createIndex('session_of_person').on('session').column('person_id').execute();
		await trx.schema.createIndex('session_by_end').on('session').column('expires').execute();

		await trx.schema
			.createTable('sign_in_try')
			// What is limited and for whom. Addresses of people are hashed: a mistyped one may be a password.
			.addColumn('key', 'text', (column) => column.primaryKey().notNull())
			.addColumn('since', 'integer', (column) => column.notNull())
			.addColumn('tries', 'integer', (column) => column.notNull())
			.modifyEnd(sql`strict`)
			.execute();
		// Counters that ran out are removed by age at every try.
		await trx.schema.createIndex('sign_in_try_by_age').on('sign_in_try').column('since').execute();
	});
}
