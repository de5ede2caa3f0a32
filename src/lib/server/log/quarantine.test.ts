import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import {
	driveHoles,
	planSeam,
	sealLines,
	withFields,
	writeLine
} from '../../../../tests/support/people';
import type { TestDevice } from '../../../../tests/support/people';
import { outcomes, TestLogServer } from '../../../../tests/support/log-server';
import { hashText } from '$lib/logbook/bytes';
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
	const plan = planSeam(crew.builder, build);
	({ seam } = plan);
	await server.push(crew.builder, build, plan.lines);
	crew.follower.n = crew.builder.n;
	crew.inspector.n = crew.builder.n;
});

async function listed(person: TestDevice = crew.owner) {
	const answer = await listQuarantine(server, person.author, build);
	return typeof answer === 'string' ? answer : answer.lines;
}

async function decide(decision: 'accept' | 'discard', ids: string[], person = crew.owner) {
	const answer = await decideQuarantine(server, person.author, build, { ids, decision });
	return typeof answer === 'string' ? answer : outcomes(answer.results);
}

describe('the quarantine', () => {
	it('is the owner’s to see and to decide', async () => {
		const stranger = await server.makePerson('Stan');
		await removeMember(server, crew.owner.author, build, crew.follower.author);
		expect(await listed()).toEqual([]);
		expect(await listed(crew.builder)).toBe('build.owner_only');
		expect(await listed(crew.follower)).toBe('build.removed');
		expect(await listed(stranger)).toBe('build.unknown');
		expect(await decide('accept', [crew.build], crew.builder)).toBe('build.owner_only');
		expect(await decide('discard', [crew.build], stranger)).toBe('build.unknown');
	});

	it('gives back what the owner accepts, with all that followed it', async () => {
		const a = driveHoles(crew.follower, build, seam, 1);
		const b = driveHoles(crew.follower, build, seam, 1, 1, { on: [a.id] });
		const note = writeLine(crew.follower, build, 'note.written', { text: 'see', replyTo: a.id });
		await server.push(crew.follower, build, [a, b, note]);
		expect(await listed()).toMatchObject([
			{ id: a.id, code: 'entry.role', text: a.text, acceptable: true },
			{ id: b.id, code: 'entry.role', acceptable: true },
			{ id: note.id, code: 'entry.referent_refused', acceptable: true }
		]);
		expect(await decide('accept', [b.id, a.id])).toEqual(['accepted', 'accepted']);
		expect(await listed()).toEqual([]);
		expect(await server.offer(crew.follower, build, [a, b, note])).toEqual([
			'duplicate',
			'duplicate',
			'duplicate'
		]);
		await server.verifyChain(build);
	});

	it('shows the owner what has long been held for a line that does not come, and takes it in as it is', async () => {
		const lost = driveHoles(crew.builder, build, seam, 1);
		const note = writeLine(crew.builder, build, 'note.written', { text: 'x' }, { seam });
		const waits = driveHoles(crew.builder, build, seam, 1, 1, { on: [lost.id] });
		const after = driveHoles(crew.builder, build, seam, 1, 1, { on: [waits.id] });
		const strike = writeLine(
			crew.builder,
			build,
			'entry.struck',
			{ entry: lost.id, reason: 'undo' },
			{ seam }
		);
		expect(await server.offer(crew.builder, build, [note, waits, after, strike])).toEqual([
			'accepted',
			'held',
			'held',
			'held'
		]);
		expect(await listed()).toEqual([]);
		const later = await listQuarantine(server, crew.owner.author, build, Date.now() + 3_600_000);
		expect(later).toMatchObject({
			lines: [
				{ id: waits.id, code: 'entry.waits', text: waits.text, acceptable: true },
				{ id: after.id, code: 'entry.waits', acceptable: true },
				{ id: strike.id, code: 'entry.waits', acceptable: false }
			]
		});
		expect(await decide('accept', [strike.id, waits.id])).toEqual(['held', 'accepted']);
		expect(await server.offer(crew.builder, build, [waits, after])).toEqual([
			'duplicate',
			'duplicate'
		]);
		expect(await decide('discard', [strike.id])).toEqual(['discarded']);
		expect(await server.offer(crew.builder, build, [strike])).toEqual(['discarded']);
		// The lost line turns up after all.
		expect(await server.offer(crew.builder, build, [lost])).toEqual(['accepted']);
		await server.verifyChain(build);
	});

	it('does not accept a line before the one it stands on', async () => {
		const a = driveHoles(crew.follower, build, seam, 1);
		const b = driveHoles(crew.follower, build, seam, 1, 1, { on: [a.id] });
		await server.push(crew.follower, build, [a, b]);
		expect(await decide('accept', [b.id])).toEqual(['pending entry.referent_refused']);
		expect(await decide('accept', [a.id])).toEqual(['accepted']);
	});

	it('answers discarded for what the owner put aside, for ever', async () => {
		const line = driveHoles(crew.follower, build, seam, 1);
		await server.push(crew.follower, build, [line]);
		expect(await decide('discard', [line.id])).toEqual(['discarded']);
		expect(await listed()).toEqual([]);
		expect(await server.offer(crew.follower, build, [line])).toEqual(['discarded']);
		await server.setRole(crew.owner, build, crew.follower, 'builder');
		expect(await server.offer(crew.follower, build, [line])).toEqual(['discarded']);
	});

	it('takes nothing whose content or seal is broken, however the owner decides', async () => {
		const broken = withFields(driveHoles(crew.builder, build, seam, 1), { colour: 'green' });
		const unsealed = driveHoles(crew.inspector, build, seam, 1);
		await server.push(crew.builder, build, [{ ...broken, hash: hashText(broken.text) }, unsealed]);
		expect(await listed()).toMatchObject([{ acceptable: false }, { acceptable: false }]);
		expect(await decide('accept', [broken.id, unsealed.id])).toEqual([
			'refused quarantine.not_acceptable',
			'refused quarantine.not_acceptable'
		]);
		expect(await decide('discard', [broken.id, unsealed.id])).toEqual(['discarded', 'discarded']);
		// Putting a broken copy aside does not take the author's own line away.
		expect(await server.offer(crew.inspector, build, [unsealed])).toEqual(['accepted']);
	});

	it('does not make a verdict of a line that no inspector wrote', async () => {
		const verdict = {
			verdict: 'in_order' as const,
			covers: [],
			digest: hashText(''),
			link: { seq: 0, link: hashText('') },
			name: 'Olga',
			statement: 'seen'
		};
		const own = writeLine(crew.owner, build, 'inspection.signed', verdict, {
			seam,
			n: crew.builder.n + 1
		});
		expect(await server.offer(crew.owner, build, [own])).toEqual(['refused entry.role']);
		expect(await decide('accept', [own.id])).toEqual(['refused entry.role']);
		// One by an inspector who has left meanwhile is a verdict.
		const late = writeLine(crew.inspector, build, 'inspection.signed', verdict, { seam });
		await removeMember(server, crew.owner.author, build, crew.inspector.author);
		expect(await server.offer(crew.inspector, build, [late])).toEqual(['refused crew.removed']);
		expect(await decide('accept', [late.id])).toEqual(['accepted']);
	});

	it('lets a line with a huge n in without pulling the counter of all devices up', async () => {
		const wild = driveHoles(crew.builder, build, seam, 7, 7, { n: 9_000_000_000_000 });
		expect(await server.offer(crew.builder, build, [wild])).toEqual(['refused entry.n_too_far']);
		const { maxN } = await server.push(crew.builder, build, []);
		expect(await decide('accept', [wild.id])).toEqual(['accepted']);
		expect((await server.push(crew.builder, build, [])).maxN).toBe(maxN);
		const next = driveHoles(crew.builder, build, seam, 8);
		expect(await server.offer(crew.builder, build, [next])).toEqual(['accepted']);
	});

	it('keeps nothing of a carried line’s other bytes once the true line has entered', async () => {
		const line = driveHoles(crew.follower, build, seam, 1);
		await server.push(crew.follower, build, [line]);
		const { text } = withFields(line, { at: '2026-12-02T00:00:00.000+01:00' });
		const other = { text, hash: hashText(text) };
		const seals = [await sealLines(crew.follower, build, [other])];
		await server.setRole(crew.owner, build, crew.follower, 'builder');
		expect(await server.offer(crew.builder, build, [other], { seals })).toEqual(['accepted']);
		expect(await server.offer(crew.follower, build, [line])).toEqual(['refused entry.id_conflict']);
		expect(await listed()).toMatchObject([{ code: 'entry.id_conflict', acceptable: false }]);
		expect(await decide('accept', [line.id])).toEqual(['duplicate']);
	});
});
