import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import {
	driveHoles,
	enrol,
	makeDevice,
	makeId,
	planSeam,
	sealLines,
	writeLine
} from '../../../../tests/support/people';
import { outcomes, TestLogServer } from '../../../../tests/support/log-server';
import { myBuilds } from './builds';
import { removeMember } from './crew';
import { decideQuarantine, listQuarantine } from './quarantine';

let server: TestLogServer;
let crew: Awaited<ReturnType<TestLogServer['makeCrew']>>;
let build: string;
let seam: string;
beforeAll(async () => {
	server = await TestLogServer.make();
});
afterAll(() => server.close());
beforeEach(async () => {
	crew = await server.makeCrew();
	({ build } = crew);
	const plan = planSeam(crew.owner, build);
	({ seam } = plan);
	await server.push(crew.owner, build, plan.lines);
	for (const device of [crew.builder, crew.inspector, crew.follower]) device.n = 50;
});

async function decide(ids: string[], decision: 'accept' | 'discard', hashes?: string[]) {
	const answer = await decideQuarantine(server, crew.owner.author, build, {
		ids,
		decision,
		...(hashes && { hashes })
	});
	return typeof answer === 'string' ? answer : outcomes(answer.results);
}

const hashesIn = async (table: 'held' | 'quarantine' | 'entry') =>
	(await server.db.selectFrom(table).select('hash').where('build', '=', build).execute()).map(
		({ hash }) => hash
	);

describe('other bytes under one id', () => {
	it('put there first do not keep a good line from the owner, who decides on either', async () => {
		const { owner, builder, follower } = crew;
		const line = driveHoles(builder, build, seam, 1);
		const other = driveHoles(follower, build, seam, 2, 2, { id: line.id });
		expect(await server.offer(follower, build, [other])).toEqual(['refused entry.role']);
		await removeMember(server, owner.author, build, builder.author);
		expect(await server.offer(builder, build, [line])).toEqual(['refused crew.removed']);
		const list = await listQuarantine(server, owner.author, build);
		if (typeof list === 'string') throw new Error(list);
		expect(new Set(list.lines.map(({ hash }) => hash))).toEqual(new Set([line.hash, other.hash]));
		expect(await decide([line.id], 'discard', [other.hash])).toEqual(['discarded']);
		expect(await decide([line.id], 'accept', [line.hash])).toEqual(['accepted']);
		expect(await server.offer(builder, build, [line])).toEqual(['duplicate']);
	});

	it('that follow their referent out of quarantine do not take the place of a held line', async () => {
		const { builder, follower } = crew;
		const held = driveHoles(builder, build, seam, 1, 1, { on: [makeId()] });
		expect(await server.offer(builder, build, [held])).toEqual(['held']);
		const first = driveHoles(follower, build, seam, 5);
		await server.offer(follower, build, [first]);
		const other = writeLine(
			follower,
			build,
			'note.written',
			{ text: 'x', replyTo: makeId() },
			{ id: held.id, seam, on: [first.id] }
		);
		await server.offer(follower, build, [other]);
		expect(await decide([first.id], 'accept')).toEqual(['accepted']);
		expect(await hashesIn('held')).toEqual([held.hash]);
	});

	it('are not accepted in the place of those the owner was shown', async () => {
		const { builder } = crew;
		const shown = writeLine(
			builder,
			build,
			'waiver.given',
			{ what: 'Paint run', reason: 'looks only' },
			{ seam }
		);
		const unseen = driveHoles(builder, build, seam, 1, 90, { id: shown.id, on: [makeId()] });
		expect(await server.offer(builder, build, [shown])).toEqual(['refused entry.role']);
		expect(await server.offer(builder, build, [unseen])).toEqual(['held']);
		expect(await hashesIn('quarantine')).toEqual([shown.hash]);
		expect(await decide([shown.id], 'accept')).toEqual(['accepted']);
		expect(await hashesIn('entry')).toContain(shown.hash);
		expect(await server.offer(builder, build, [unseen])).toEqual(['refused entry.id_conflict']);
	});
});

describe('a false enrolment of a device', () => {
	it('does not break the seals of the true one, and nothing sealed with its key enters by the true one', async () => {
		const { builder, follower, inspector } = crew;
		const phone = { ...(await makeDevice(builder.author)), n: 80 };
		const first = enrol(phone, build);
		const line = driveHoles(phone, build, seam, 7);
		const seals = [await sealLines(phone, build, [first, line])];
		const fake = { ...(await makeDevice(builder.author)), device: phone.device, n: 90 };
		const falseOne = enrol(fake, build);
		const forged = driveHoles(fake, build, seam, 8);
		const falseSeals = [await sealLines(fake, build, [falseOne, forged])];
		expect(await server.offer(follower, build, [falseOne, forged], { seals: falseSeals })).toEqual([
			'refused device.carried',
			'refused entry.referent_refused'
		]);
		await server.offer(inspector, build, [first], { seals });
		expect(await server.offer(inspector, build, [line], { seals })).toEqual([
			'refused entry.referent_refused'
		]);
		expect(await server.offer(builder, build, [first], { seals })).toEqual(['accepted']);
		const accepted = await hashesIn('entry');
		expect(accepted).toContain(line.hash);
		expect(accepted).not.toContain(forged.hash);
		expect(await decide([forged.id], 'accept')).toEqual(['refused quarantine.not_acceptable']);
		expect(await server.offer(follower, build, [forged], { seals: [] })).not.toContain('accepted');
	});

	it('costs a push the same, however many wait', async () => {
		const { builder, follower } = crew;
		const many = await Promise.all(
			Array.from({ length: 200 }, async () => {
				const device = { ...builder, device: makeId(), n: 1 };
				const line = enrol(device, build);
				return { line, seal: await sealLines(device, build, [line]) };
			})
		);
		await server.offer(
			follower,
			build,
			many.map(({ line }) => line),
			{ seals: many.map(({ seal }) => seal) }
		);
		const fresh = { ...(await makeDevice(builder.author)), n: 90 };
		const lines = Array.from({ length: 50 }, (_, i) => driveHoles(fresh, build, seam, i + 1));
		const before = process.cpuUsage();
		expect(new Set(await server.offer(builder, build, lines))).toEqual(
			new Set(['refused device.unknown'])
		);
		expect(process.cpuUsage(before).user / 1000).toBeLessThan(300);
	});
});

describe('what the owner is told waits', () => {
	it('counts lines that have long been held', async () => {
		const { owner, builder } = crew;
		const line = driveHoles(builder, build, seam, 1, 1, { on: [makeId()] });
		expect(await server.offer(builder, build, [line])).toEqual(['held']);
		const told = async (now?: number) =>
			(await myBuilds(server, owner.author, now)).builds.find((row) => row.build === build)
				?.quarantined;
		expect(await told()).toBe(0);
		expect(await told(Date.now() + 3_600_000)).toBe(1);
	});

	it('and a line numbered so far out that nothing could stand on it is not taken in', async () => {
		const { builder } = crew;
		const wild = driveHoles(builder, build, seam, 1, 1, { n: 2 ** 50 + 1 });
		expect(await server.offer(builder, build, [wild])).toEqual(['refused entry.n_too_far']);
		expect(await decide([wild.id], 'accept')).toEqual(['refused entry.n_too_far']);
	});
});
