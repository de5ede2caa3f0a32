import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { hashText } from '$lib/logbook/bytes';
import { readEntry } from '$lib/logbook/entry';
import { foldBuild } from '$lib/logbook/fold/build';
import { lineOf } from '$lib/logbook/fold/line';
import type { SealMessage } from '$lib/logbook/wire';
import type { z } from 'zod';
import {
	driveHoles,
	enrol,
	openBuild,
	planSeam,
	sealedPush,
	sealLines,
	writeLine
} from '../../../../tests/support/people';
import { outcomes, TestLogServer } from '../../../../tests/support/log-server';
import { removeMember } from './crew';
import { pull } from './pull';
import { push } from './push';

let server: TestLogServer;
beforeEach(async () => {
	server = await TestLogServer.make();
});
afterEach(() => server.close());

type Crew = Awaited<ReturnType<TestLogServer['makeCrew']>>;
type Seal = z.infer<typeof SealMessage>;

/** What a phone keeps of a build: every line, every seal, and the server's signature over the place they lead to. */
async function memoryOf(person: string, build: string) {
	const page = await pull(server, person, build, { after: 0, limit: 1000 });
	if (typeof page === 'string') throw new Error(page);
	const { proof, texts } = await server.proofOf(person, build);
	return {
		proof,
		seals: page.seals,
		head: page.next,
		lines: texts.map((text) => ({ text, hash: hashText(text) }))
	};
}

/** Accounts come back with the database or are made anew under the same id. */
async function withAccounts(crew: Crew): Promise<void> {
	for (const [name, { author, email }] of Object.entries(crew).filter(
		(entry): entry is [string, Crew['owner']] => typeof entry[1] !== 'string'
	))
		await server.addAccount(author, name, email);
}

describe('after the server was restored from a copy of its database', () => {
	it('a phone hears that the history differs, offers what is lacking, and all of it is accepted unjudged', async () => {
		const crew = await server.makeCrew();
		const { build, owner, builder } = crew;
		const plan = planSeam(builder, build);
		await server.push(builder, build, plan.lines);
		await server.backUp();
		const { seq } = await server.verifyChain(build);
		const driven = Array.from({ length: 30 }, (_, i) =>
			driveHoles(builder, build, plan.seam, i + 1)
		);
		await server.push(builder, build, driven);
		// Judged now, the removed builder's lines would not pass; accepted once, they do.
		await removeMember(server, owner.author, build, builder.author);
		const { proof, seals, lines, head } = await memoryOf(owner.author, build);
		await server.restore();

		const late = await sealedPush(owner, build, [], { cursor: head });
		expect(await push(server, owner.author, build, late)).toBe('history.differs');
		const lost = lines.slice(seq);
		expect(lost).toHaveLength(31);
		const answer = await server.push(owner, build, lost, { seals, proofs: [proof] });
		expect(new Set(outcomes(answer.results))).toEqual(new Set(['accepted']));
		expect(answer.cursor.seq).toBe(head.seq);
		await server.verifyChain(build);
		// The crew line among them counts again.
		const line = driveHoles(builder, build, plan.seam, 99);
		expect(await server.offer(builder, build, [line])).toEqual(['refused crew.removed']);
	});

	it('a proof for lines it does not hold, or a changed one, proves nothing', async () => {
		const { build, builder, owner } = await server.makeCrew();
		const plan = planSeam(builder, build);
		await server.push(builder, build, plan.lines);
		await server.backUp();
		const driven = driveHoles(builder, build, plan.seam, 1);
		await server.push(builder, build, [driven]);
		await removeMember(server, owner.author, build, builder.author);
		const { proof } = await memoryOf(owner.author, build);
		const other = driveHoles(builder, build, plan.seam, 2);
		const rows = proof.rows.map(([received, hash]): [number, string] => [
			received,
			hash === driven.hash ? other.hash : hash
		]);
		const seals = [await sealLines(builder, build, [other])] as Seal[];
		const forged = { ...proof, rows };
		expect(await server.offer(owner, build, [other], { seals, proofs: [forged, proof] })).toEqual([
			'refused crew.removed'
		]);
		const stranger = await server.makePerson('Stan');
		const request = await sealedPush(stranger, build, [other], { proofs: [forged] });
		expect(await push(server, stranger.author, build, request)).toBe('build.unknown');
	});

	it('a member whose joining was lost is let in by proof and brings it back', async () => {
		const owner = await server.makePerson('Olga');
		const mia = await server.makePerson('Mia');
		const { build } = await startBuild(owner);
		await server.backUp();
		await server.admit(owner, build, mia, 'builder');
		await server.push(mia, build, [enrol(mia, build)]);
		const unsent = writeLine(mia, build, 'note.written', { text: 'mine' });
		const { proof, seals, lines } = await memoryOf(mia.author, build);
		await server.restore();
		// Her new line comes before what makes her known again: nothing final is said of it.
		expect(await server.offer(mia, build, [unsent, ...lines], { seals, proofs: [proof] })).toEqual([
			'refused device.unknown',
			...lines.map((_, i) => (i < 4 ? 'duplicate' : 'accepted'))
		]);
		expect(await server.offer(mia, build, [unsent])).toEqual(['accepted']);
		await server.verifyChain(build);
	});

	it('a line the server itself wrote needs no proof but the server’s own seal', async () => {
		const owner = await server.makePerson('Olga');
		const mia = await server.makePerson('Mia');
		const { build } = await startBuild(owner);
		await server.backUp();
		await server.admit(owner, build, mia, 'builder');
		const { seals, lines } = await memoryOf(mia.author, build);
		await server.restore();
		expect(await server.offer(mia, build, lines, { seals })).toEqual([
			'duplicate',
			'duplicate',
			'duplicate',
			'duplicate',
			'accepted'
		]);
		expect(
			await server.offer(mia, build, [
				enrol(mia, build),
				writeLine(mia, build, 'note.written', { text: 'back' })
			])
		).toEqual(['accepted', 'accepted']);
	});

	it('an old joining that was lost does not bring back whom the owner removed since', async () => {
		const owner = await server.makePerson('Olga');
		const mal = await server.makePerson('Mal');
		const { build } = await startBuild(owner);
		await server.backUp();
		await server.admit(owner, build, mal, 'builder');
		const { seals, lines } = await memoryOf(mal.author, build);
		await server.restore();
		await server.admit(owner, build, mal, 'builder');
		await server.push(mal, build, [enrol(mal, build)]);
		await removeMember(server, owner.author, build, mal.author);
		expect(await server.offer(mal, build, lines.slice(-1), { seals })).toEqual(['accepted']);
		const note = writeLine(mal, build, 'note.written', { text: 'x' }, { n: 60 });
		expect(await server.offer(mal, build, [note])).toEqual(['refused crew.removed']);
		expect(await foldedCrew(owner.author, build)).toEqual({
			[owner.author]: 'owner',
			[mal.author]: 'left'
		});
		// And back in, by a line that knows of all of these.
		await server.admit(owner, build, mal, 'inspector');
		expect(await server.offer(mal, build, [note])).toEqual(['accepted']);
		expect(await foldedCrew(owner.author, build)).toMatchObject({ [mal.author]: 'inspector' });
	});

	it('a build that is gone altogether is made again by whoever has it, for its author', async () => {
		const crew = await server.makeCrew();
		const { build, owner, builder } = crew;
		const plan = planSeam(builder, build);
		await server.push(builder, build, plan.lines);
		const { proof, seals, lines, head } = await memoryOf(crew.follower.author, build);
		await server.restore({ empty: true });
		await withAccounts(crew);
		const answer = await server.push(crew.follower, build, lines, { seals, proofs: [proof] });
		expect(new Set(outcomes(answer.results))).toEqual(new Set(['accepted']));
		// The same lines in the same order, and none of the server's own a second time.
		expect(answer.cursor.seq).toBe(head.seq);
		await server.verifyChain(build);
		expect((await server.pullAll(owner.author, build)).entries.map((line) => line.text)).toEqual(
			lines.map((line) => line.text)
		);
		await server.setRole(owner, build, crew.follower, 'builder');
		expect(
			await server.offer(crew.follower, build, [
				driveHoles(crew.follower, build, plan.seam, 1, 1, { n: builder.n + 5 })
			])
		).toEqual(['accepted']);
	});

	it('a body that was withdrawn does not come back with a phone that still has it', async () => {
		const { build, owner, builder } = await server.makeCrew();
		const note = writeLine(builder, build, 'note.written', { text: 'Jane Doe' });
		await server.backUp();
		await server.push(builder, build, [note]);
		const old = await memoryOf(builder.author, build);
		const withdrawal = writeLine(
			owner,
			build,
			'entry.withdrawn',
			{ entry: note.id, ground: 'law' },
			{ n: note.n + 1 }
		);
		await server.push(owner, build, [withdrawal]);
		const { proof } = await proofWithHashes(owner.author, build);
		await server.restore();
		expect(await server.offer(owner, build, [withdrawal], { proofs: [proof] })).toEqual([
			'accepted'
		]);
		expect(
			await server.offer(builder, build, [note], { seals: old.seals, proofs: [old.proof] })
		).toEqual(['accepted']);
		const { entries } = await server.pullAll(owner.author, build);
		expect(JSON.stringify(entries)).not.toContain('Jane Doe');
		await server.verifyChain(build);
	});
});

/** A proof built from hashes, as a phone does for lines whose body it no longer has. */
async function proofWithHashes(person: string, build: string) {
	const page = await pull(server, person, build, { after: 0, limit: 1000 });
	if (typeof page === 'string') throw new Error(page);
	const { proof } = await server.proofOf(person, build);
	return {
		proof: {
			...proof,
			rows: page.entries.map((line): [number, string] => [
				line.received,
				line.withdrawn?.hash ?? hashText(line.text ?? '')
			])
		}
	};
}

/** The crew as every phone folds it. */
async function foldedCrew(person: string, build: string) {
	const { entries } = await server.pullAll(person, build);
	const lines = entries.flatMap(({ text }) => lineOf(readEntry(text)) ?? []);
	return Object.fromEntries(foldBuild(lines).crew);
}

async function startBuild(owner: Crew['owner']) {
	const begun = openBuild(owner);
	await server.push(owner, begun.build, [begun.opened, begun.enrolled]);
	return begun;
}
