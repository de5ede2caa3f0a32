import { sql } from 'kysely';
import { start } from '$lib/logbook/chain';
import type { Place } from '$lib/logbook/chain';
import type { RefusalCode } from '$lib/logbook/refusals';
import type { Seal } from '$lib/logbook/seal';
import type { HaveAnswer, HaveRequest, PullAnswer, PulledLine, PullQuery } from '$lib/logbook/wire';
import type { z } from 'zod';
import type { Db } from '../db';
import type { LogServer } from './log-server';
import { crewRefusal } from './membership';

/** A page ends after so many bytes of lines and seals, or after one line that is larger. */
const PAGE_BYTES = 1024 * 1024;

/** The lines after a place the caller knows, with the seals over them. Never a line twice, never one left out. */
export async function pull(
	{ db, key }: LogServer,
	actor: string,
	build: string,
	query: PullQuery
): Promise<PullAnswer | RefusalCode> {
	const refused = await crewRefusal(db, build, actor);
	if (refused) return refused;
	const place = await placeAt(db, build, query);
	if (typeof place === 'string') return place;
	const last = await lastOfPage(db, build, place.seq, query.limit);
	const rows = await db
		.selectFrom('entry')
		.leftJoin('withdrawn', (join) =>
			join.onRef('withdrawn.build', '=', 'entry.build').onRef('withdrawn.id', '=', 'entry.id')
		)
		.select(['entry.seq', 'text', 'hash', 'received', 'link', 'seal', 'withdrawn.by'])
		.where('entry.build', '=', build)
		.where('entry.seq', '>', place.seq)
		.where('entry.seq', '<=', last)
		.orderBy('entry.seq')
		.execute();
	const { names, seals } = await sealsOf(db, build, rows);
	const entries = rows.map(({ seq, text, hash, received, seal, by }): PulledLine => {
		const line = { seq, received, seal: names.get(seal) };
		return by === null ? { ...line, text } : { ...line, withdrawn: { hash, envelope: text, by } };
	});
	// Read last: the head is never behind the lines it is answered with.
	const { seq: head, max_n: maxN } = await db
		.selectFrom('build')
		.select(['seq', 'max_n'])
		.where('id', '=', build)
		.executeTakeFirstOrThrow();
	const end = rows.at(-1);
	const next = end === undefined ? place : { seq: end.seq, link: end.link };
	return { entries, seals, next: key.signPlace(build, next), head, maxN };
}

async function placeAt(db: Db, build: string, query: PullQuery): Promise<Place | RefusalCode> {
	if (query.after === 0) return start(build);
	if (query.link === undefined) return 'request.malformed';
	const row = await db
		.selectFrom('entry')
		.select('link')
		.where('build', '=', build)
		.where('seq', '=', query.after)
		.executeTakeFirst();
	if (row?.link !== query.link) return 'history.differs';
	const place: Place = { seq: query.after, link: query.link };
	return place;
}

/** How far a page reaches, from the sizes alone: a thousand of the largest lines must not meet in memory. */
async function lastOfPage(db: Db, build: string, after: number, limit: number): Promise<number> {
	const sizes = await db
		.selectFrom('entry')
		.innerJoin('seal', (join) =>
			join.onRef('seal.build', '=', 'entry.build').onRef('seal.name', '=', 'entry.seal')
		)
		.select([
			'seq',
			'seal',
			sql<number>`octet_length(text)`.as('bytes'),
			sql<number>`octet_length(hashes)`.as('sealBytes')
		])
		.where('entry.build', '=', build)
		.where('seq', '>', after)
		.orderBy('seq')
		.limit(limit)
		.execute();
	const seals = new Set<string>();
	let last = after;
	let bytes = 0;
	for (const row of sizes) {
		bytes += row.bytes + (seals.has(row.seal) ? 0 : row.sealBytes);
		if (bytes > PAGE_BYTES && last > after) break;
		seals.add(row.seal);
		last = row.seq;
	}
	return last;
}

async function sealsOf(
	db: Db,
	build: string,
	rows: readonly { seal: string }[]
): Promise<{ names: Map<string, number>; seals: (Seal & { hashes: string[] })[] }> {
	const wanted = [...new Set(rows.map((row) => row.seal))];
	const found = await db
		.selectFrom('seal')
		.select(['name', 'device', 'hashes', 'signature'])
		.where('build', '=', build)
		.where('name', 'in', sql<string>`(select value from json_each(${JSON.stringify(wanted)}))`)
		.execute();
	return {
		names: new Map(found.map(({ name }, i) => [name, i])),
		seals: found.map(({ device, hashes, signature }) => ({
			device,
			hashes: JSON.parse(hashes) as string[],
			signature
		}))
	};
}

/** Which of these lines the server has neither in the log nor held: those are to be offered. */
export async function have(
	{ db }: LogServer,
	actor: string,
	build: string,
	{ ids }: z.infer<typeof HaveRequest>
): Promise<z.infer<typeof HaveAnswer> | RefusalCode> {
	const refused = await crewRefusal(db, build, actor);
	if (refused) return refused;
	const { rows } = await sql<{ id: string }>`
		select value as id from json_each(${JSON.stringify(ids)})
		where value not in (select id from entry where build = ${build} and id = value)
			and value not in (select id from held where build = ${build} and id = value)
	`.execute(db);
	return { lacking: rows.map((row) => row.id) };
}
