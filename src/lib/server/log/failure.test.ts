import { sql } from 'kysely';
import { afterEach, beforeEach, expect, it } from 'vitest';
import { sealedPush, writeLine } from '../../../../tests/support/people';
import { TestLogServer } from '../../../../tests/support/log-server';
import { DiskFullError } from '../write';
import { push } from './push';

// The failures are meant; the log of this process is read once, at the first of them.
process.env['LOG_LEVEL'] = 'silent';

let server: TestLogServer;
beforeEach(async () => {
	server = await TestLogServer.make();
});
afterEach(() => server.close());

it('on a full disk nothing is acknowledged, nothing is kept, and it goes on once there is room', async () => {
	const { build, builder } = await server.makeCrew();
	const lines = Array.from({ length: 100 }, () =>
		writeLine(builder, build, 'note.written', { text: 'x'.repeat(4000) })
	);
	const { seq } = await server.verifyChain(build);
	const { rows } = await sql<{ page_count: number }>`pragma page_count`.execute(server.db);
	await sql`pragma max_page_count = ${sql.raw(String(rows[0]?.page_count ?? 0))}`.execute(
		server.db
	);
	await expect(server.push(builder, build, lines)).rejects.toThrow(DiskFullError);
	expect((await server.verifyChain(build)).seq).toBe(seq);
	await sql`pragma max_page_count = 1000000`.execute(server.db);
	expect(new Set(await server.offer(builder, build, lines))).toEqual(new Set(['accepted']));
});

it('a line that breaks the database keeps only itself out, and the push it came in is not acknowledged', async () => {
	const { build, builder } = await server.makeCrew();
	const lines = ['one', 'poison', 'three'].map((text) =>
		writeLine(builder, build, 'note.written', { text })
	);
	await sql`
		create trigger poison before insert on entry when new.text like '%poison%'
		begin select raise(abort, 'poisoned'); end`.execute(server.db);
	const request = await sealedPush(builder, build, lines);
	await expect(push(server, builder.author, build, request)).rejects.toThrow('poisoned');
	// The device halves its batches on a failure like this one; it ends up with the one line that causes it.
	expect(await server.offer(builder, build, lines.slice(0, 1))).toEqual(['duplicate']);
	expect(await server.offer(builder, build, lines.slice(2))).toEqual(['accepted']);
	await server.verifyChain(build);
});

it('the connection that acknowledges writes through to the disk', async () => {
	const { rows } = await sql<{ synchronous: number }>`pragma synchronous`.execute(server.db);
	expect(rows).toEqual([{ synchronous: 2 }]);
});
