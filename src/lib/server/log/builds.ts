import { sql } from 'kysely';
import type { BuildsAnswer } from '$lib/logbook/wire';
import type { z } from 'zod';
import type { LogServer } from './log-server';
import { HELD_PATIENCE } from './quarantine';

/**
 * The builds of a person, also those they were removed from: a phone must hear "removed" to stop asking, and may not
 * take a build that is merely missing for one.
 */
export async function myBuilds(
	{ db }: LogServer,
	actor: string,
	now = Date.now()
): Promise<z.infer<typeof BuildsAnswer>> {
	const rows = await db
		.selectFrom('member')
		.innerJoin('build', 'build.id', 'member.build')
		.select(['build.id', 'build.name', 'build.seq', 'member.role', 'member.left'])
		.select((select) =>
			select
				.selectFrom('quarantine')
				.select(sql<number>`count(*)`.as('count'))
				.whereRef('quarantine.build', '=', 'build.id')
				.where('decision', 'is', null)
				.as('quarantined')
		)
		.select((select) =>
			select
				.selectFrom('held')
				.select(sql<number>`count(*)`.as('count'))
				.whereRef('held.build', '=', 'build.id')
				.where('held.received', '<=', now - HELD_PATIENCE)
				.as('waiting')
		)
		.where('member.person', '=', actor)
		.orderBy('build.id')
		.execute();
	return {
		builds: rows.map(({ id, name, seq, role, left, quarantined, waiting }) =>
			left === 1
				? { build: id, name, role: null, removed: true, head: 0 }
				: {
						build: id,
						name,
						role,
						head: seq,
						...(role === 'owner' && { quarantined: (quarantined ?? 0) + (waiting ?? 0) })
					}
		)
	};
}
