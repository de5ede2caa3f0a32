import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { writeLine } from '../../../../tests/support/people';
import { TestLogServer } from '../../../../tests/support/log-server';
import { tallybarProcess } from '../process';
import { removeMember } from './crew';

let server: TestLogServer;
beforeEach(async () => {
	server = await TestLogServer.make();
});
afterEach(() => server.close());

async function openStream(person: string, session = `session-of-${person}`) {
	await server.db
		.insertInto('session')
		.values({ id: session, person_id: person, created: 0, expires: Date.now() + 1e6 })
		.onConflict((conflict) => conflict.doNothing())
		.execute();
	const reader = server.live.open(person, session).getReader();
	let text = '';
	const events: unknown[] = [];
	return {
		/** The next message, or undefined when the stream has ended. */
		async next(): Promise<unknown> {
			while (events.length === 0) {
				const { done, value } = await reader.read();
				if (done) return undefined;
				text += new TextDecoder().decode(value);
				const parts = text.split('\n\n');
				text = parts.pop() ?? '';
				for (const part of parts)
					if (part.startsWith('data: ')) events.push(JSON.parse(part.slice(6)));
			}
			return events.shift();
		},
		cancel: () => reader.cancel()
	};
}

describe('the live stream', () => {
	it('tells where each build of the person stands, then every change', async () => {
		const { build, owner, builder } = await server.makeCrew();
		const { seq: head } = await server.verifyChain(build);
		const stream = await openStream(builder.author);
		expect(await stream.next()).toEqual({ build, head });
		await server.push(owner, build, [writeLine(owner, build, 'note.written', { text: 'x' })]);
		expect(await stream.next()).toEqual({ build, head: head + 1 });
	});

	it('tells of a build the person was just brought into', async () => {
		const { build, owner } = await server.makeCrew();
		const mia = await server.makePerson('Mia');
		const stream = await openStream(mia.author);
		await server.admit(owner, build, mia, 'builder');
		expect(await stream.next()).toMatchObject({ build });
	});

	it('tells what another process wrote', async () => {
		const { build, owner } = await server.makeCrew();
		const stream = await openStream(owner.author);
		const first = (await stream.next()) as { head: number };
		const elsewhere = server.live;
		server.live = new (elsewhere.constructor as new (db: typeof server.db) => typeof elsewhere)(
			server.db
		);
		await server.push(owner, build, [writeLine(owner, build, 'note.written', { text: 'x' })]);
		expect(await stream.next()).toEqual({ build, head: first.head + 1 });
		elsewhere.close();
	});

	it('ends when the person is removed from a build', async () => {
		const { build, owner, builder } = await server.makeCrew();
		const stream = await openStream(builder.author);
		await stream.next();
		await removeMember(server, owner.author, build, builder.author);
		// The line that says so may still be told of.
		let message = await stream.next();
		while (message !== undefined) message = await stream.next();
		expect(message).toBeUndefined();
	});

	it('ends within five seconds of the end of its session', async () => {
		const { owner } = await server.makeCrew();
		const stream = await openStream(owner.author);
		await stream.next();
		const from = Date.now();
		await server.db.deleteFrom('session').execute();
		expect(await stream.next()).toBeUndefined();
		expect(Date.now() - from).toBeLessThan(5000);
	});

	it('ends when the server is asked to stop, and leaves nothing behind', async () => {
		const { owner } = await server.makeCrew();
		const hooks = tallybarProcess().whenDraining;
		const before = hooks.size;
		const stream = await openStream(owner.author);
		await stream.next();
		expect(hooks.size).toBe(before + 1);
		for (const hook of [...hooks]) await hook();
		expect(await stream.next()).toBeUndefined();
		expect(hooks.size).toBe(before);
	});

	it('forgets a reader that went away', async () => {
		const { owner } = await server.makeCrew();
		const before = tallybarProcess().whenDraining.size;
		const stream = await openStream(owner.author);
		await stream.next();
		await stream.cancel();
		expect(tallybarProcess().whenDraining.size).toBe(before);
	});
});
