/**
 * Schedules of mishaps and what must hold at the end of each, whatever happened. How many are run is set by SCHEDULES
 * (all files together); the seed of a failure is printed and SEED replays it.
 */
import fc from 'fast-check';
import { expect } from 'vitest';
import type { Role } from '../../src/lib/logbook/kinds';
import { refusal, isRefusalCode } from '../../src/lib/logbook/refusals';
import { WORK, World, type Mishap, type Phone } from './world';

const mishap = fc.constantFrom<Mishap>(
	'none',
	'none',
	'lost',
	'answer lost',
	'answer lost',
	'twice',
	'write between',
	'server fails'
);
const who = fc.nat(6);
const bench = fc.record({
	what: fc.constantFrom(...WORK),
	seam: fc.nat(1),
	from: fc.integer({ min: 1, max: 8 }),
	size: fc.nat(3)
});

const work = fc.record({ do: fc.constant('work' as const), who, bench });
const sync = fc.record({
	do: fc.constant('sync' as const),
	who,
	mishaps: fc.array(mishap, { maxLength: 6 }),
	page: fc.integer({ min: 1, max: 9 }),
	between: bench
});
/** What any crew lives through in a year. */
const ordinary = [
	{ arbitrary: work, weight: 10 },
	{ arbitrary: sync, weight: 8 },
	{
		arbitrary: fc.record({
			do: fc.constant('clock' as const),
			who,
			years: fc.constantFrom(-30, -1, 0, 1, 40)
		}),
		weight: 1
	},
	{
		arbitrary: fc.record({ do: fc.constantFrom('reopen' as const, 'pass time' as const), who }),
		weight: 2
	}
];
/** What a crew should not have to live through. */
const rare = [
	{
		arbitrary: fc.record({
			do: fc.constantFrom('clone' as const, 'count wildly' as const, 'poison' as const),
			who
		}),
		weight: 1
	},
	{
		arbitrary: fc.record({ do: fc.constantFrom('back up' as const, 'restore' as const), who }),
		weight: 2
	},
	{
		arbitrary: fc.record({
			do: fc.constantFrom('remove' as const, 'admit' as const, 'lose' as const),
			who
		}),
		weight: 2
	},
	{
		arbitrary: fc.record({
			do: fc.constant('role' as const),
			who,
			role: fc.constantFrom<Role>('builder', 'follower', 'inspector')
		}),
		weight: 1
	},
	{ arbitrary: fc.record({ do: fc.constant('hand over' as const), who, to: who }), weight: 1 },
	{ arbitrary: fc.record({ do: fc.constant('decide' as const), who }), weight: 1 }
];
type Step = { ordinary: typeof ordinary; rare: typeof rare } extends {
	ordinary: { arbitrary: fc.Arbitrary<infer A> }[];
	rare: { arbitrary: fc.Arbitrary<infer B> }[];
}
	? A | B
	: never;

async function take(world: World, step: Step): Promise<void> {
	const phone = world.phones[step.who % world.phones.length] as Phone;
	const { person } = phone;
	switch (step.do) {
		case 'work':
			return world.work(phone, step.bench.what, step.bench.seam, step.bench.from, step.bench.size);
		case 'sync': {
			const { what, seam, from, size } = step.between;
			phone.mishaps = [...step.mishaps];
			phone.page = step.page;
			// The phone itself goes on being used, and another one syncs, between two pages.
			phone.between = async () => {
				await world.work(phone, what, seam, from, size);
				const other = world.phones[(step.who + 1) % world.phones.length] as Phone;
				if (other !== phone && other.between === undefined) await world.sync(other);
			};
			await world.sync(phone);
			phone.mishaps = [];
			phone.between = undefined;
			return;
		}
		case 'clock': {
			world.wrongClock(phone, step.years);
			return;
		}
		case 'reopen':
			return world.reopen(phone);
		case 'pass time': {
			world.passTime();
			return;
		}
		case 'clone':
			return world.clone(phone);
		case 'count wildly':
			return world.countWildly(phone);
		case 'poison': {
			const waiting = (await world.outbox(phone)).find(({ state }) => state === 'waiting');
			if (waiting) world.poison.add(waiting.id);
			return;
		}
		case 'back up':
			return world.server.backUp();
		case 'restore':
			return world.server.restore();
		case 'remove':
			return world.remove(person);
		case 'lose':
			world.lose(phone);
			return;
		case 'admit':
			return world.admit(person);
		case 'role':
			return world.changeRole(person, step.role);
		case 'hand over':
			return world.handOver(phone, world.phones[step.to % world.phones.length] as Phone);
		case 'decide':
			await world.acceptQuarantine();
	}
}

async function check(world: World): Promise<void> {
	// With a phone is lost what only it had. Everything else is not.
	const existing = world.lost > 0 ? await world.existing() : undefined;
	const survives = (id: string) => existing?.has(id) ?? true;
	await world.heal();
	const accepted = await world.accepted();
	const { held, quarantined } = await world.aside();

	// The server: a sound chain without gaps, each id once (the table says so), a sound file.
	const head = await world.server.verifyChain(world.build);
	expect(head.seq).toBe(accepted.size);

	// Nothing acknowledged is lost, and it is byte for byte what was acknowledged.
	for (const [id, hash] of world.acknowledged)
		if (survives(id)) expect(accepted.get(id)?.hash ?? (await world.whereIs(id))).toBe(hash);

	// Nothing a phone called saved is lost: it is in the log, or refused where people see it, on both sides.
	const refused = new Map<string, string>();
	for (const phone of world.phones)
		for (const { id, state, code } of await world.outbox(phone)) {
			expect(
				['refused', 'pending', 'discarded'],
				`${id} is still ${state} ${code ?? ''}`
			).toContain(state);
			refused.set(id, code ?? '');
		}
	for (const [id, text] of world.saved) {
		const there = accepted.get(id);
		if (there) expect(there.text).toBe(text);
		else if (survives(id)) {
			const code = refused.get(id) ?? 'nowhere';
			expect(isRefusalCode(code) && refusal(code).says, `${id}: ${code}`).toBeTruthy();
			expect(quarantined.has(id) || held.has(id), `${id} (${code}) is not with the owner`).toBe(
				true
			);
		}
	}
	// Nothing appears that nobody wrote, beside what the server writes itself.
	const server = world.server.key.device;
	for (const [id, { text }] of accepted)
		if (!world.saved.has(id))
			expect(JSON.parse(text)).toMatchObject(
				text.includes('"device.enrolled"') ? {} : { device: server }
			);

	// Everybody sees the same, and counts what is in the log and nothing else.
	const expected = World.foldsOfTexts(
		[...accepted.values()].map(({ text }) => text),
		world.seams
	);
	for (const phone of world.phones) {
		expect(await world.counted(phone)).toEqual(new Set(accepted.keys()));
		expect(await world.foldsOf(phone)).toEqual(expected);
	}
}

async function play(
	roles: readonly Exclude<Role, 'owner'>[],
	steps: readonly Step[]
): Promise<void> {
	const world = await World.make(roles);
	try {
		for (const step of steps) await take(world, step);
		await check(world);
	} finally {
		await world.close();
	}
}

/** Schedules of everything that can happen; see the module. */
export async function runSchedules(share: number, weather: 'ordinary' | 'rare'): Promise<void> {
	const all = Number(process.env['SCHEDULES'] || 200);
	// The same schedules at every `npm test`, so that a failure is of this change; `npm run property:long` tries others.
	const chosen = process.env['SEED'] || '20261201';
	const seed = chosen === 'random' ? Math.floor(Math.random() * 2 ** 31) : Number(chosen);
	console.log(`${Math.ceil(all * share)} schedules of ${weather} mishaps, seed ${seed}`);
	const roles = fc.array(
		fc.constantFrom<Exclude<Role, 'owner'>>('builder', 'builder', 'inspector', 'follower'),
		{ minLength: 2, maxLength: 4 }
	);
	const steps = fc.array(fc.oneof(...ordinary, ...(weather === 'rare' ? rare : [])), {
		minLength: 5,
		maxLength: 40,
		size: 'max'
	});
	await fc.assert(fc.asyncProperty(roles, steps, play), {
		numRuns: Math.ceil(all * share),
		seed,
		// Shrinking a long schedule takes minutes; the seed is enough to go on with.
		...(!process.env['SHRINK'] && { endOnFailure: true })
	});
}
