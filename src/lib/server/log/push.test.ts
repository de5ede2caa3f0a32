import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { canonicalText } from '$lib/logbook/bytes';
import { hashText } from '$lib/logbook/bytes';
import { start } from '$lib/logbook/chain';
import {
	driveHoles,
	enrol,
	makeDevice,
	makeId,
	openBuild,
	planSeam,
	sealLines,
	sealedPush,
	withFields,
	writeLine
} from '../../../../tests/support/people';
import type { TestDevice, TestLine } from '../../../../tests/support/people';
import { outcomes, TestLogServer } from '../../../../tests/support/log-server';
import { removeMember } from './crew';
import { push } from './push';
import { decideQuarantine } from './quarantine';

let server: TestLogServer;
beforeAll(async () => {
	server = await TestLogServer.make();
});
afterAll(() => server.close());

type Crew = Awaited<ReturnType<TestLogServer['makeCrew']>>;

function changed(line: TestLine, fields: Record<string, unknown>) {
	const { id, text } = withFields(line, fields);
	return { id, text, hash: hashText(text) };
}

async function quarantineOf(build: string) {
	const rows = await server.db
		.selectFrom('quarantine')
		.select(['id', 'code', 'decision'])
		.where('build', '=', build)
		.orderBy('received')
		.orderBy('id')
		.execute();
	return Object.fromEntries(rows.map((row) => [row.id, row.decision ?? row.code]));
}

describe('a build begins', () => {
	it('with the line of its author, who becomes the owner in the same transaction', async () => {
		const owner = await server.makePerson('Olga');
		const { build, opened, enrolled } = openBuild(owner);
		const plan = planSeam(owner, build);
		const answer = await server.push(owner, build, [opened, enrolled, ...plan.lines]);
		expect(outcomes(answer.results)).toEqual(['accepted', 'accepted', 'accepted', 'accepted']);
		const { entries } = await server.pullAll(owner.author, build);
		expect(entries.map((line) => (JSON.parse(line.text) as { kind: string }).kind)).toEqual([
			'build.opened',
			'device.enrolled',
			'crew.joined',
			'device.enrolled',
			'assembly.planned',
			'seam.planned'
		]);
		expect(answer.cursor.seq).toBe(6);
		expect(await server.verifyChain(build)).toMatchObject({ seq: 6, link: answer.cursor.link });
	});

	it('whatever the order of the lines in the batch', async () => {
		const owner = await server.makePerson('Olga');
		const { build, opened, enrolled } = openBuild(owner);
		expect(await server.offer(owner, build, [enrolled, opened])).toEqual(['accepted', 'accepted']);
	});

	it('not in the session of somebody else, and not without a seal that holds', async () => {
		const owner = await server.makePerson('Olga');
		const other = await server.makePerson('Otto');
		const { build, opened, enrolled } = openBuild(owner);
		const request = await sealedPush(owner, build, [opened, enrolled]);
		expect(await push(server, other.author, build, request)).toBe('build.unknown');
		expect(await push(server, owner.author, build, { ...request, seals: [] })).toBe(
			'build.unknown'
		);
		const rows = await server.db.selectFrom('build').where('id', '=', build).select('id').execute();
		expect(rows).toEqual([]);
	});

	it('once: offered twice it is a duplicate and nothing is added', async () => {
		const owner = await server.makePerson('Olga');
		const { build, opened, enrolled } = openBuild(owner);
		await server.push(owner, build, [opened, enrolled]);
		expect(await server.offer(owner, build, [opened, enrolled])).toEqual([
			'duplicate',
			'duplicate'
		]);
		expect((await server.verifyChain(build)).seq).toBe(4);
	});
});

describe('one bad line', () => {
	let crew: Crew;
	let build: string;
	let builder: TestDevice;
	let seam: string;
	beforeAll(async () => {
		crew = await server.makeCrew();
		({ build, builder } = crew);
		const plan = planSeam(builder, build);
		seam = plan.seam;
		await server.push(builder, build, plan.lines);
	});

	/** Pushes it between two good ones and answers what was said of it. */
	async function amongGood(
		bad: Pick<TestLine, 'text' | 'hash'>,
		more: Parameters<TestLogServer['push']>[3] = {},
		carrier = builder
	): Promise<string | undefined> {
		const good = [driveHoles(carrier, build, seam, 1), driveHoles(carrier, build, seam, 2)];
		const [first, outcome, last] = await server.offer(
			carrier,
			build,
			[good[0] as TestLine, bad, good[1] as TestLine],
			more
		);
		expect([first, last]).toEqual(['accepted', 'accepted']);
		return outcome;
	}

	it('that is no JSON is refused by name', async () => {
		const text = '{"id":';
		expect(await amongGood({ text, hash: hashText(text) })).toBe('refused entry.not_canonical');
	});

	it('that is not written canonically is refused by name', async () => {
		const text = driveHoles(builder, build, seam, 3).text.replace('{', '{ ');
		expect(await amongGood({ text, hash: hashText(text) })).toBe('refused entry.not_canonical');
	});

	it('with a field missing is refused by name and kept for the owner to see', async () => {
		const bad = changed(driveHoles(builder, build, seam, 3), { body: { method: 'driven' } });
		expect(await amongGood(bad)).toBe('refused entry.malformed');
		expect(await quarantineOf(build)).toMatchObject({ [bad.id]: 'entry.malformed' });
		// Never pending: the owner cannot accept it.
		expect(await server.offer(builder, build, [bad])).toEqual(['refused entry.malformed']);
	});

	it('with an unknown field is refused by name', async () => {
		const bad = changed(driveHoles(builder, build, seam, 3), { colour: 'green' });
		expect(await amongGood(bad)).toBe('refused entry.unknown_field');
	});

	it('that is too large is refused by name', async () => {
		const note = writeLine(builder, build, 'note.written', { text: 'x' });
		const bad = changed(note, { body: { text: 'x'.repeat(40_000) } });
		expect(await amongGood(bad)).toBe('refused entry.too_large');
		const row = await server.db
			.selectFrom('quarantine')
			.select('text')
			.where('id', '=', bad.id)
			.executeTakeFirst();
		expect(row).toEqual({ text: null });
	});

	it('of an unknown kind waits on the device and leaves no trace', async () => {
		const bad = changed(driveHoles(builder, build, seam, 3), { kind: 'holes.welded' });
		expect(await amongGood(bad)).toBe('refused entry.unknown_kind');
		expect(await quarantineOf(build)).not.toHaveProperty(bad.id);
	});

	it('of another build is refused, and its text is not shown here', async () => {
		const bad = driveHoles(builder, makeId(), seam, 3);
		expect(await amongGood(bad)).toBe('refused entry.wrong_build');
		const row = await server.db
			.selectFrom('quarantine')
			.select(['build', 'text'])
			.where('id', '=', bad.id)
			.executeTakeFirst();
		expect(row).toEqual({ build, text: null });
	});

	it('in the name of another member is refused by name', async () => {
		const bad = changed(driveHoles(builder, build, seam, 3), { author: crew.owner.author });
		expect(await amongGood(bad)).toBe('refused entry.forged_author');
	});

	it('in the name of somebody who never was in the crew is refused by name', async () => {
		const bad = changed(driveHoles(builder, build, seam, 3), { author: makeId() });
		expect(await amongGood(bad)).toBe('refused entry.author_unknown');
	});

	it('in the name of another member, from their device, without its seal is refused by name', async () => {
		const bad = driveHoles(crew.owner, build, seam, 3);
		expect(await amongGood(bad)).toBe('refused seal.missing');
	});

	it('of a device that is enrolled for another person is refused by name', async () => {
		// Honestly sealed by the owner's device, but written in the builder's name.
		const bad = changed(driveHoles(crew.owner, build, seam, 3), { author: builder.author });
		const seals = [await sealLines(crew.owner, build, [bad])];
		expect(await amongGood(bad, { seals })).toBe('refused device.other_person');
	});

	it('with a broken seal is refused by name', async () => {
		const bad = driveHoles(crew.owner, build, seam, 3);
		const seal = await sealLines(crew.owner, build, [bad]);
		const first = seal.signature.startsWith('A') ? 'B' : 'A';
		const broken = { ...seal, signature: first + seal.signature.slice(1) };
		expect(await amongGood(bad, { seals: [broken] })).toBe('refused seal.broken');
	});

	it('with a seal stolen from another build is refused by name', async () => {
		const bad = driveHoles(crew.owner, build, seam, 3);
		const stolen = await sealLines(crew.owner, makeId(), [bad]);
		expect(await amongGood(bad, { seals: [stolen] })).toBe('refused seal.broken');
	});

	it('carried with the seal of its own device is accepted from anybody in the crew', async () => {
		const carried = driveHoles(crew.owner, build, seam, 3);
		const seals = [await sealLines(crew.owner, build, [carried])];
		expect(await amongGood(carried, { seals })).toBe('accepted');
	});

	it('whose seal was broken on the way is accepted when it comes with a sound one', async () => {
		const line = driveHoles(crew.owner, build, seam, 4);
		expect(await amongGood(line)).toBe('refused seal.missing');
		expect(await quarantineOf(build)).toMatchObject({ [line.id]: 'seal.missing' });
		expect(await server.offer(crew.owner, build, [line])).toEqual(['accepted']);
		expect(await quarantineOf(build)).not.toHaveProperty(line.id);
	});

	it('of a device that is not enrolled waits on the device', async () => {
		const device = { ...(await makeDevice(builder.author)), n: builder.n };
		const line = driveHoles(device, build, seam, 3);
		const seals = [await sealLines(device, build, [line])];
		expect(await amongGood(line, { seals })).toBe('refused device.unknown');
		expect(await server.offer(device, build, [enrol(device, build), line])).toEqual([
			'accepted',
			'accepted'
		]);
	});

	it('that enrols a device for another person is for the owner: a key enters in its own person’s session', async () => {
		const forged = await makeDevice(crew.owner.author);
		const line = enrol(forged, build);
		const seals = [await sealLines(forged, build, [line])];
		expect(await amongGood(line, { seals })).toBe('refused device.carried');
	});

	it('of a device somebody else brought goes the way of its enrolment, in whichever push it comes', async () => {
		// Bea's second phone never reached the server and is lost; Ines has its lines from a file.
		const phone = { ...(await makeDevice(builder.author)), n: builder.n };
		const [first, a, b] = [
			enrol(phone, build),
			driveHoles(phone, build, seam, 3),
			driveHoles(phone, build, seam, 4)
		];
		const seals = [await sealLines(phone, build, [first, a, b])];
		const { inspector, owner } = crew;
		expect(await server.offer(inspector, build, [first, a], { seals })).toEqual([
			'refused device.carried',
			'refused entry.referent_refused'
		]);
		expect(await server.offer(inspector, build, [b], { seals })).toEqual([
			'refused entry.referent_refused'
		]);
		// Whose key it is nobody but Bea can say, in her own session: not Ines, and not the owner.
		await decideQuarantine(server, owner.author, build, {
			ids: [first.id, a.id],
			decision: 'accept'
		});
		const { entries } = await server.pullAll(owner.author, build);
		expect(entries.map((line) => line.text)).not.toContain(first.text);
		// She imports the file into her new phone.
		expect(await server.offer(builder, build, [first], { seals })).toEqual(['accepted']);
		expect(await server.offer(inspector, build, [first, a, b], { seals })).toEqual([
			'duplicate',
			'duplicate',
			'duplicate'
		]);
		await server.verifyChain(build);
	});

	it('that gives an enrolled device another key is refused by name', async () => {
		const { publicKey } = await makeDevice();
		const line = writeLine(builder, build, 'device.enrolled', { key: publicKey });
		expect(await amongGood(line)).toBe('refused device.enrolled_before');
	});

	it('that enrols a device of another build for somebody else is refused by name', async () => {
		const thief = await makeDevice(crew.follower.author);
		const stolen = { ...thief, device: builder.device };
		const owner = await server.makePerson('Olga');
		const other = openBuild(owner);
		await server.push(owner, other.build, [other.opened, other.enrolled]);
		await server.admit(owner, other.build, { ...crew.follower }, 'builder');
		expect(await server.offer(stolen, other.build, [enrol(stolen, other.build)])).toEqual([
			'refused device.enrolled_before'
		]);
	});

	it('beyond its author’s role is refused, then pending until the owner decides', async () => {
		const line = driveHoles(crew.follower, build, seam, 3, 3, { n: builder.n + 1 });
		expect(await server.offer(crew.follower, build, [line])).toEqual(['refused entry.role']);
		expect(await server.offer(crew.follower, build, [line])).toEqual(['pending entry.role']);
		await server.setRole(crew.owner, build, crew.follower, 'builder');
		expect(await server.offer(crew.follower, build, [line])).toEqual(['accepted']);
		expect(await quarantineOf(build)).not.toHaveProperty(line.id);
		await server.setRole(crew.owner, build, crew.follower, 'follower');
	});

	it('that only the server may write is refused by name', async () => {
		const bad = writeLine(crew.owner, build, 'crew.joined', { person: makeId(), role: 'builder' });
		const seals = [await sealLines(crew.owner, build, [bad])];
		expect(await amongGood(bad, { seals })).toBe('refused entry.server_only');
	});

	it('with a huge n is refused and does not move the counter', async () => {
		const { maxN } = await server.push(builder, build, []);
		const bad = driveHoles(builder, build, seam, 3, 3, { n: 2 ** 52 });
		expect(await amongGood(bad)).toBe('refused entry.n_too_far');
		expect((await server.push(builder, build, [])).maxN).toBeLessThan(maxN + 10);
	});

	it('that refers to a line written after it is refused by name', async () => {
		const later = driveHoles(builder, build, seam, 3, 3, { n: builder.n + 50 });
		await server.push(builder, build, [later]);
		const bad = driveHoles(builder, build, seam, 3, 3, { on: [later.id], n: later.n - 10 });
		expect(await amongGood(bad)).toBe('refused entry.reference_forward');
	});

	it('that refers to a line of another seam is refused by name', async () => {
		const plan = planSeam(builder, build);
		const elsewhere = driveHoles(builder, build, plan.seam, 1);
		await server.push(builder, build, [...plan.lines, elsewhere]);
		const bad = driveHoles(builder, build, seam, 1, 1, { on: [elsewhere.id] });
		expect(await amongGood(bad)).toBe('refused entry.reference_elsewhere');
	});

	it('with an id of the log and other bytes is refused; the one in the log stays', async () => {
		const line = driveHoles(builder, build, seam, 3);
		await server.push(builder, build, [line]);
		const bad = changed(line, { at: '2026-12-01T21:40:05.121+01:00' });
		expect(await amongGood(bad)).toBe('refused entry.id_conflict');
		expect(await server.offer(builder, build, [line])).toEqual(['duplicate']);
		const { entries } = await server.pullAll(builder.author, build);
		expect(entries.filter((entry) => entry.text === line.text)).toHaveLength(1);
		expect(entries.filter((entry) => entry.text === bad.text)).toHaveLength(0);
	});

	it('leaves the history whole: gapless, chained, every text with its hash', async () => {
		const { seq } = await server.verifyChain(build);
		const { entries } = await server.pullAll(builder.author, build);
		expect(entries.map((line) => line.seq)).toEqual(Array.from({ length: seq }, (_, i) => i + 1));
	});
});

describe('lines that wait', () => {
	let crew: Crew;
	let build: string;
	let seam: string;
	let builder: TestDevice;
	beforeEach(async () => {
		crew = await server.makeCrew();
		({ build, builder } = crew);
		const plan = planSeam(builder, build);
		seam = plan.seam;
		await server.push(builder, build, plan.lines);
	});

	function chainOf(length: number, device = builder): TestLine[] {
		device.n = Math.max(device.n, builder.n);
		const lines: TestLine[] = [];
		for (let i = 0; i < length; i++) {
			const before = lines.at(-1);
			lines.push(driveHoles(device, build, seam, 1, 1, { on: before ? [before.id] : [] }));
		}
		return lines;
	}

	it('are held on the disk, outside the history, and enter it in order when their referent comes', async () => {
		const [a, b, c] = chainOf(3) as [TestLine, TestLine, TestLine];
		const { seq } = await server.verifyChain(build);
		expect(await server.offer(builder, build, [c])).toEqual(['held']);
		expect(await server.offer(builder, build, [c, b])).toEqual(['held', 'held']);
		expect((await server.verifyChain(build)).seq).toBe(seq);
		expect(await server.offer(builder, build, [a])).toEqual(['accepted']);
		const { entries } = await server.pullAll(builder.author, build);
		expect(entries.slice(-3).map((line) => line.text)).toEqual([a.text, b.text, c.text]);
		expect(await server.offer(builder, build, [c])).toEqual(['duplicate']);
		const held = await server.db
			.selectFrom('held')
			.select('id')
			.where('build', '=', build)
			.execute();
		expect(held).toEqual([]);
	});

	it('are answered as accepted when their referent comes later in the same push', async () => {
		const lines = chainOf(40).reverse();
		expect(new Set(await server.offer(builder, build, lines))).toEqual(new Set(['accepted']));
		await server.verifyChain(build);
	});

	it('do not keep a good line with the same id out', async () => {
		const good = driveHoles(builder, build, seam, 5);
		const squatter = changed(good, { on: [makeId()], n: good.n + 1 });
		expect(await server.offer(builder, build, [squatter])).toEqual(['held']);
		expect(await server.offer(builder, build, [good])).toEqual(['accepted']);
		expect(await server.offer(builder, build, [squatter])).toEqual(['refused entry.id_conflict']);
	});

	it('are not overwritten by other bytes that wait as well', async () => {
		const line = driveHoles(builder, build, seam, 5, 5, { on: [makeId()] });
		expect(await server.offer(builder, build, [line])).toEqual(['held']);
		const other = changed(line, { on: [makeId()] });
		expect(await server.offer(builder, build, [other])).toEqual(['refused entry.id_conflict']);
		expect(await server.offer(builder, build, [line])).toEqual(['held']);
	});

	it('follow their referent into quarantine, and out of it', async () => {
		const [a, b, c] = chainOf(3, crew.follower) as [TestLine, TestLine, TestLine];
		const note = writeLine(crew.follower, build, 'note.written', { text: 'see', replyTo: c.id });
		expect(await server.offer(crew.follower, build, [note])).toEqual(['held']);
		const reply = writeLine(
			builder,
			build,
			'note.written',
			{ text: 'yes', replyTo: note.id },
			{
				n: note.n + 1
			}
		);
		expect(await server.offer(builder, build, [reply])).toEqual(['held']);
		expect(await server.offer(crew.follower, build, [a, b, c])).toEqual([
			'refused entry.role',
			'refused entry.role',
			'refused entry.role'
		]);
		expect(await quarantineOf(build)).toMatchObject({
			[note.id]: 'entry.referent_refused',
			[reply.id]: 'entry.referent_refused'
		});
		expect(await server.offer(builder, build, [reply])).toEqual(['pending entry.referent_refused']);
		await server.setRole(crew.owner, build, crew.follower, 'builder');
		expect(await server.offer(crew.follower, build, [a, b, c])).toEqual([
			'accepted',
			'accepted',
			'accepted'
		]);
		expect(await quarantineOf(build)).toEqual({});
		expect(await server.offer(builder, build, [note, reply].slice(1))).toEqual(['duplicate']);
		await server.verifyChain(build);
	});

	it('that come in the same push after a refused one follow it', async () => {
		const [a, b] = chainOf(2, crew.follower) as [TestLine, TestLine];
		const note = writeLine(crew.follower, build, 'note.written', { text: 'see', replyTo: b.id });
		expect(await server.offer(crew.follower, build, [a, b, note])).toEqual([
			'refused entry.role',
			'refused entry.role',
			'refused entry.referent_refused'
		]);
	});
});

describe('who is let in', () => {
	it('a stranger gets 404 and leaves nothing behind', async () => {
		const { build } = await server.makeCrew();
		const stranger = await server.makePerson('Stan');
		const line = writeLine(stranger, build, 'note.written', { text: 'hello' });
		const request = await sealedPush(stranger, build, [enrol(stranger, build), line]);
		expect(await push(server, stranger.author, build, request)).toBe('build.unknown');
		expect(await quarantineOf(build)).toEqual({});
	});

	it('what a former member still sends waits for the owner, and enters when they are back', async () => {
		const { build, owner, builder } = await server.makeCrew();
		const line = writeLine(builder, build, 'note.written', { text: 'last words' });
		await removeMember(server, owner.author, build, builder.author);
		expect(await server.offer(builder, build, [line])).toEqual(['refused crew.removed']);
		expect(await server.offer(builder, build, [line])).toEqual(['pending crew.removed']);
		await server.admit(owner, build, builder, 'builder');
		expect(await server.offer(builder, build, [line])).toEqual(['accepted']);
		await server.verifyChain(build);
	});

	it('one carrier cannot fill the quarantine with what can never be accepted', async () => {
		const { build, builder } = await server.makeCrew();
		const rows = Array.from({ length: 1999 }, (_, i) => ({
			build,
			id: `filler-${i}`,
			hash: '',
			text: null,
			seal: null,
			carrier: builder.author,
			code: 'entry.malformed',
			stands_on: null,
			received: 0,
			decision: null,
			decided_by: null,
			decided_at: null
		}));
		for (let i = 0; i < rows.length; i += 500)
			await server.db
				.insertInto('quarantine')
				.values(rows.slice(i, i + 500))
				.execute();
		const bad = [1, 2, 3].map(() =>
			changed(writeLine(builder, build, 'note.written', { text: 'x' }), { v: 0 })
		);
		expect(await server.offer(builder, build, bad)).toEqual(
			Array<string>(3).fill('refused entry.malformed')
		);
		const { count } = await server.db
			.selectFrom('quarantine')
			.select((select) => select.fn.countAll<number>().as('count'))
			.where('build', '=', build)
			.executeTakeFirstOrThrow();
		expect(count).toBe(2000);
	});
});

describe('the answer', () => {
	it('says that a device must be made anew when its n comes twice, and takes both lines', async () => {
		const { build, builder } = await server.makeCrew();
		const one = writeLine(builder, build, 'note.written', { text: 'here' });
		expect(await server.push(builder, build, [one])).not.toHaveProperty('mint');
		const clone = writeLine(builder, build, 'note.written', { text: 'there' }, { n: one.n });
		const answer = await server.push(builder, build, [clone]);
		expect(outcomes(answer.results)).toEqual(['accepted']);
		expect(answer.mint).toBe(true);
		expect(await server.push(builder, build, [clone])).not.toHaveProperty('mint');
	});

	it('names the history: a place that is not in it refuses the whole push', async () => {
		const { build, builder } = await server.makeCrew();
		const line = writeLine(builder, build, 'note.written', { text: 'x' });
		const { cursor } = await server.push(builder, build, [line]);
		const ask = async (seq: number, link: string) => {
			const request = await sealedPush(builder, build, [line], { cursor: { seq, link } });
			const answer = await push(server, builder.author, build, request);
			return typeof answer === 'string' ? answer : 'taken';
		};
		expect(await ask(cursor.seq, cursor.link)).toBe('taken');
		expect(await ask(cursor.seq - 1, cursor.link)).toBe('history.differs');
		expect(await ask(cursor.seq + 1, cursor.link)).toBe('history.differs');
		expect(await ask(cursor.seq, start(build).link)).toBe('history.differs');
		expect(await ask(0, cursor.link)).toBe('taken');
	});

	it('numbers the lines of four clients without a gap or a double', async () => {
		const { build, owner, builder, inspector, follower } = await server.makeCrew();
		const devices = [owner, builder, inspector, follower];
		const before = (await server.verifyChain(build)).seq;
		await Promise.all(
			devices.flatMap((device) =>
				Array.from({ length: 10 }, async () => {
					const lines = Array.from({ length: 7 }, (_, i) =>
						writeLine(device, build, 'note.written', { text: `note ${i}` })
					);
					expect(new Set(await server.offer(device, build, lines))).toEqual(new Set(['accepted']));
				})
			)
		);
		expect((await server.verifyChain(build)).seq).toBe(before + 4 * 10 * 7);
	});
});

describe('a body that is withdrawn', () => {
	it('is gone from the server; envelope, hash and mark stay', async () => {
		const { build, owner, builder } = await server.makeCrew();
		const note = writeLine(builder, build, 'note.written', { text: 'her name is Jane Doe' });
		await server.push(builder, build, [note]);
		const withdrawal = writeLine(
			owner,
			build,
			'entry.withdrawn',
			{ entry: note.id, ground: 'owner' },
			{ n: note.n + 1 }
		);
		expect(await server.offer(owner, build, [withdrawal])).toEqual(['accepted']);
		const { entries } = await server.pullAll(owner.author, build);
		const stored = entries.find((line) => line.text.includes(note.id));
		const envelope = JSON.parse(note.text) as Record<string, never>;
		delete envelope['body'];
		expect(stored?.text).toBe(canonicalText(envelope));
		expect(await server.offer(builder, build, [note])).toEqual(['duplicate']);
		await server.verifyChain(build);
	});

	it('also when line and withdrawal come in one push', async () => {
		const { build, owner } = await server.makeCrew();
		const note = writeLine(owner, build, 'note.written', { text: 'her name is Jane Doe' });
		const withdrawal = writeLine(owner, build, 'entry.withdrawn', {
			entry: note.id,
			ground: 'law'
		});
		expect(await server.offer(owner, build, [note, withdrawal])).toEqual(['accepted', 'accepted']);
		const { entries } = await server.pullAll(owner.author, build);
		expect(JSON.stringify(entries)).not.toContain('Jane Doe');
	});

	it('only of notes, photos, recordings and names, and only by the owner', async () => {
		const { build, owner, builder } = await server.makeCrew();
		const plan = planSeam(builder, build);
		const driven = driveHoles(builder, build, plan.seam, 1);
		const note = writeLine(builder, build, 'note.written', { text: 'x' });
		await server.push(builder, build, [...plan.lines, driven, note]);
		const of = (device: TestDevice, id: string) =>
			writeLine(
				device,
				build,
				'entry.withdrawn',
				{ entry: id, ground: 'owner' },
				{ n: note.n + 1 }
			);
		expect(await server.offer(owner, build, [of(owner, driven.id)])).toEqual([
			'refused withdraw.not_possible'
		]);
		expect(await server.offer(builder, build, [of(builder, note.id)])).toEqual([
			'refused entry.role'
		]);
	});
});
