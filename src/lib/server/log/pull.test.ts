import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { hashText } from '$lib/logbook/bytes';
import { next, placeStatement, start } from '$lib/logbook/chain';
import { readPublicKey, verify, verifySeal } from '$lib/logbook/seal';
import { PullAnswer } from '$lib/logbook/wire';
import { makeId, writeLine } from '../../../../tests/support/people';
import { TestLogServer } from '../../../../tests/support/log-server';
import { myBuilds } from './builds';
import { addMember, changeRole, readCrew, removeMember } from './crew';
import { have, pull } from './pull';

let server: TestLogServer;
beforeAll(async () => {
	server = await TestLogServer.make();
});
afterAll(() => server.close());

async function page(person: string, build: string, after = start(''), limit = 1000) {
	const answer = await pull(server, person, build, { after: after.seq, link: after.link, limit });
	if (typeof answer === 'string') throw new Error(answer);
	return answer;
}

describe('a pull', () => {
	it('hands over lines and seals that anybody can check against the keys in the log', async () => {
		const { build, owner, builder } = await server.makeCrew();
		await server.push(builder, build, [writeLine(builder, build, 'note.written', { text: 'x' })]);
		const answer = PullAnswer.parse(await page(owner.author, build));
		const keys = new Map<string, CryptoKey>();
		let place = start(build);
		for (const line of answer.entries) {
			const text = line.text ?? '';
			const entry = JSON.parse(text) as { kind: string; device: string; body: { key: string } };
			place = next(place, { ...line, hash: hashText(text) });
			if (entry.kind === 'device.enrolled')
				keys.set(entry.device, (await readPublicKey(entry.body.key)) as CryptoKey);
		}
		expect(answer.next).toMatchObject(place);
		for (const line of answer.entries) {
			const { device } = JSON.parse(line.text ?? '') as { device: string };
			const seal = answer.seals[line.seal ?? -1];
			expect(seal?.device).toBe(device);
			expect(seal?.hashes).toContain(hashText(line.text ?? ''));
			const key = keys.get(device) as CryptoKey;
			expect(await verifySeal(key, build, seal as NonNullable<typeof seal>)).toBe(true);
		}
		const serverKey = keys.get(server.key.device) as CryptoKey;
		expect(await verify(serverKey, placeStatement(build, place), answer.next.signature)).toBe(true);
		expect(answer.head).toBe(place.seq);
	});

	it('goes on from any place of the history, and an empty page stays where it was', async () => {
		const { build, owner } = await server.makeCrew();
		const first = await page(owner.author, build, undefined, 3);
		expect(first.entries.map((line) => line.seq)).toEqual([1, 2, 3]);
		const rest = await page(owner.author, build, first.next);
		expect(rest.entries[0]?.seq).toBe(4);
		const none = await page(owner.author, build, rest.next);
		expect(none.entries).toEqual([]);
		expect(none.next).toMatchObject({ seq: rest.next.seq, link: rest.next.link });
		const { seq, link } = rest.next;
		const ask = (after: number, at?: string) =>
			pull(server, owner.author, build, { after, link: at, limit: 10 });
		expect(await ask(seq - 1, link)).toBe('history.differs');
		expect(await ask(seq + 1, link)).toBe('history.differs');
		expect(await ask(seq)).toBe('request.malformed');
	});

	it('ends a page after about a megabyte, however many lines were asked for', async () => {
		const { build, owner } = await server.makeCrew();
		for (let i = 0; i < 20; i++)
			await server.push(
				owner,
				build,
				Array.from({ length: 20 }, () =>
					writeLine(owner, build, 'note.written', { text: 'x'.repeat(4000) })
				)
			);
		const sizes: number[] = [];
		let place = start(build);
		for (;;) {
			const answer = await page(owner.author, build, place);
			if (answer.entries.length === 0) break;
			sizes.push(JSON.stringify(answer).length);
			place = answer.next;
		}
		expect(sizes.length).toBe(2);
		expect(Math.max(...sizes)).toBeLessThan(1.3 * 1024 * 1024);
		expect(place.seq).toBe((await server.verifyChain(build)).seq);
	});
});

describe('who may read a build', () => {
	it('its crew; a former member is told so, a stranger learns nothing', async () => {
		const { build, owner, builder } = await server.makeCrew();
		const stranger = await server.makePerson('Stan');
		await removeMember(server, owner.author, build, builder.author);
		const asks = [
			(person: string) => pull(server, person, build, { after: 0, limit: 10 }),
			(person: string) => have(server, person, build, { ids: [] }),
			(person: string) => readCrew(server, person, build)
		];
		for (const ask of asks) {
			expect(await ask(builder.author)).toBe('build.removed');
			expect(await ask(stranger.author)).toBe('build.unknown');
			expect(typeof (await ask(owner.author))).toBe('object');
		}
		expect((await myBuilds(server, builder.author)).builds).toMatchObject([
			{ build, role: null, removed: true, head: 0 }
		]);
		expect((await myBuilds(server, stranger.author)).builds).toEqual([]);
		expect((await myBuilds(server, owner.author)).builds).toMatchObject([
			{ build, role: 'owner', quarantined: 0 }
		]);
	});
});

it('have names the lines the server lacks: neither in the log nor held', async () => {
	const { build, builder } = await server.makeCrew();
	const note = (more = {}) => writeLine(builder, build, 'note.written', { text: 'x', ...more });
	const there = note();
	const held = note({ replyTo: makeId() });
	const lacking = note();
	expect(await server.offer(builder, build, [there, held])).toEqual(['accepted', 'held']);
	const ids = [there.id, held.id, lacking.id];
	expect(await have(server, builder.author, build, { ids })).toEqual({ lacking: [lacking.id] });
});

describe('the crew', () => {
	it('is the owner’s to change, by lines the server writes', async () => {
		const { build, owner, builder } = await server.makeCrew();
		const mia = await server.makePerson('Mia');
		expect(await addMember(server, builder.author, build, mia.email, 'builder')).toBe(
			'build.owner_only'
		);
		expect(await addMember(server, mia.author, build, mia.email, 'owner')).toBe(
			'crew.role_unknown'
		);
		expect(await addMember(server, mia.author, build, mia.email, 'builder')).toBe('build.unknown');
		expect(await addMember(server, owner.author, build, 'nobody@example.org', 'builder')).toBe(
			'crew.no_account'
		);
		expect(await addMember(server, owner.author, build, builder.email, 'builder')).toBe(
			'crew.already_in'
		);
		const added = await addMember(
			server,
			owner.author,
			build,
			` ${mia.email.toUpperCase()} `,
			'follower'
		);
		expect(added).toMatchObject({
			crew: expect.arrayContaining([
				{ person: mia.author, name: 'Mia', role: 'follower' }
			]) as unknown
		});
		await changeRole(server, owner.author, build, mia.author, 'inspector');
		await removeMember(server, owner.author, build, mia.author);
		expect(await removeMember(server, owner.author, build, mia.author)).toBe('crew.not_in');
		const { entries } = await server.pullAll(owner.author, build);
		expect(entries.slice(-3).map((line) => JSON.parse(line.text) as object)).toMatchObject([
			{ kind: 'crew.joined', author: owner.author, device: server.key.device },
			{ kind: 'crew.role', body: { person: mia.author, role: 'inspector' } },
			{ kind: 'crew.left', body: { person: mia.author } }
		]);
		await server.verifyChain(build);
	});

	it('keeps one owner: the last can neither go nor step down, only hand over', async () => {
		const { build, owner, builder } = await server.makeCrew();
		expect(await removeMember(server, owner.author, build, owner.author)).toBe('crew.last_owner');
		expect(await changeRole(server, owner.author, build, owner.author, 'builder')).toBe(
			'crew.last_owner'
		);
		await changeRole(server, owner.author, build, builder.author, 'owner');
		expect(await removeMember(server, owner.author, build, builder.author)).toBe(
			'build.owner_only'
		);
		const crew = await readCrew(server, owner.author, build);
		expect(crew).toMatchObject({
			crew: expect.arrayContaining([
				expect.objectContaining({ person: owner.author, role: 'builder' }),
				expect.objectContaining({ person: builder.author, role: 'owner' })
			]) as unknown
		});
	});

	it('of two owners who remove each other at once one stays', async () => {
		const { build, owner, builder } = await server.makeCrew();
		await server.db
			.updateTable('member')
			.set({ role: 'owner' })
			.where('build', '=', build)
			.where('person', '=', builder.author)
			.execute();
		const answers = await Promise.all([
			removeMember(server, owner.author, build, builder.author),
			removeMember(server, builder.author, build, owner.author)
		]);
		expect(answers.map((answer) => typeof answer)).toEqual(['object', 'string']);
		expect(answers[1]).toBe('build.removed');
	});

	it('of two hand-overs at once one is made', async () => {
		const { build, owner, builder, inspector } = await server.makeCrew();
		const answers = await Promise.all([
			changeRole(server, owner.author, build, builder.author, 'owner'),
			changeRole(server, owner.author, build, inspector.author, 'owner')
		]);
		expect(answers[1]).toBe('build.owner_only');
	});
});
