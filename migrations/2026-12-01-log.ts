import { sql } from 'kysely';
import type { Kysely } from 'kysely';

/**
 * The log of every build. `entry` is the truth; everything else here is either derived from it in the same
 * transaction (build, member, device, withdrawn) or waits beside it (held, quarantine).
 *
 * All tables are STRICT: a text in a number's column would change the order of a history without an error.
 */
export async function up(db: Kysely<any>): Promise<void> {
	await db.transaction().execute(async (trx) => {
		// The head of each build stands in one row: a push reads and raises it without looking at the lines, so
		// its cost does not grow with the log. `name` is the last one given, for lists of builds only.
		await sql`
			create table build (
				id text primary key not null,
				seq integer not null,
				link text not null,
				max_n integer not null,
				name text not null,
				opened integer not null
			) strict, without rowid`.execute(trx);

		// `text` alone is the line. hash, n, device, author, kind, v, seam and assembly repeat what stands in it,
		// because a line is judged by what it refers to and parsing every referent again would cost a push more
		// than all the rest. `link` is kept for each line, not only for the head: a phone names any place it
		// once knew, and recomputing the chain up to it would grow with the log.
		await sql`
			create table entry (
				build text not null references build (id),
				seq integer not null,
				id text not null,
				hash text not null,
				n integer not null,
				device text not null,
				author text not null,
				kind text not null,
				v integer not null,
				seam text,
				assembly text,
				text text not null,
				received integer not null,
				link text not null,
				seal text not null,
				primary key (build, seq)
			) strict`.execute(trx);
		// Unique per build, not over all: else whoever saw an id could use it up in a build of their own.
		await sql`create unique index entry_id on entry (build, id)`.execute(trx);
		// Finds a copied profile: two lines of one device with one n. Not unique, both lines are true.
		await sql`create index entry_device_n on entry (build, device, n)`.execute(trx);

		// The few crew lines of a build, read when another is written: who is in the crew is folded from all of
		// them together. A query uses it only with this very list of kinds.
		await sql`
			create index entry_crew on entry (build)
			where kind in ('crew.joined', 'crew.role', 'crew.left', 'owner.changed')`.execute(trx);

		// Who is in the crew now, folded from the crew lines; `left` keeps former members known, for what
		// they still send is kept for the owner while a stranger's is not.
		await sql`
			create table member (
				build text not null references build (id),
				person text not null,
				role text not null,
				left integer not null,
				primary key (build, person)
			) strict, without rowid`.execute(trx);
		// "My builds" and the live stream ask by person; the key above is sorted by build.
		await sql`create index member_person on member (person)`.execute(trx);

		// Folded from the device.enrolled lines: the first for a device counts.
		await sql`
			create table device (
				build text not null references build (id),
				device text not null,
				person text not null,
				key text not null,
				primary key (build, device)
			) strict, without rowid`.execute(trx);
		// A device has one key and one person wherever it is enrolled; asked at every new enrolment.
		await sql`create index device_anywhere on device (device)`.execute(trx);

		// One seal covers up to a whole push; its lines name it, so that it is stored and pulled once.
		await sql`
			create table seal (
				build text not null references build (id),
				name text not null,
				device text not null,
				hashes text not null,
				signature text not null,
				primary key (build, name)
			) strict`.execute(trx);

		// In both of these by id and hash: other bytes under one id take nobody's place.
		// Acknowledged, on disk, and outside the history until what it refers to has arrived.
		await sql`
			create table held (
				build text not null references build (id),
				id text not null,
				hash text not null,
				text text not null,
				seal text not null,
				carrier text not null,
				waits_for text not null,
				received integer not null,
				primary key (build, id, hash)
			) strict`.execute(trx);
		await sql`create index held_waits_for on held (build, waits_for)`.execute(trx);

		// Refused, kept for the owner. `text` is null when it was too large to keep or not of this build;
		// `seal` is null when none was sound; `stands_on` is the refused line this one followed.
		await sql`
			create table quarantine (
				build text not null references build (id),
				id text not null,
				hash text not null,
				text text,
				seal text,
				carrier text not null,
				code text not null,
				stands_on text,
				received integer not null,
				decision text check (decision = 'discarded'),
				decided_by text,
				decided_at integer,
				primary key (build, id, hash)
			) strict`.execute(trx);
		await sql`create index quarantine_stands_on on quarantine (build, stands_on)`.execute(trx);
		// Counts what one carrier has put there: the limit is per carrier, so that one cannot fill it for all.
		await sql`create index quarantine_carrier on quarantine (build, carrier)`.execute(trx);

		// Which bodies were withdrawn, and by which line. A table, not a mark on the line: after a restore the
		// withdrawal may arrive before what it withdraws.
		await sql`
			create table withdrawn (
				build text not null references build (id),
				id text not null,
				by text not null,
				primary key (build, id)
			) strict, without rowid`.execute(trx);
	});
}
