import { expect, it } from 'vitest';
import { HaveRequest } from '$lib/logbook/wire';
import { readBody } from './http';

const LIMIT = 1024 * 1024;

/** A body that comes in pieces, as with `Transfer-Encoding: chunked`, and says nothing about its length. */
function chunked(bytes: number): Request {
	let sent = 0;
	const body = new ReadableStream<Uint8Array>({
		pull(controller) {
			if (sent >= bytes) {
				controller.close();
				return;
			}
			const piece = new Uint8Array(Math.min(65_536, bytes - sent)).fill(32);
			sent += piece.length;
			controller.enqueue(piece);
		}
	});
	return new Request('http://x.test', { method: 'POST', body, duplex: 'half' } as RequestInit);
}

const post = (body: BodyInit) => new Request('http://x.test', { method: 'POST', body });

it('a body is counted as it comes and refused one byte beyond the limit', async () => {
	expect(await readBody(chunked(LIMIT), HaveRequest)).toBe('request.malformed');
	expect(await readBody(chunked(LIMIT + 1), HaveRequest)).toBe('request.too_large');
	expect(await readBody(chunked(50 * LIMIT), HaveRequest)).toBe('request.too_large');
});

it('what is no JSON of the schema is malformed, never an error', async () => {
	for (const body of ['', '{', 'null', '[]', '{"ids":{}}', '{"ids":[1]}', '{"ids":["x"]}'])
		expect(await readBody(post(body), HaveRequest)).toBe('request.malformed');
	expect(await readBody(post(new Uint8Array([0xff, 0xfe])), HaveRequest)).toBe('request.malformed');
	expect(await readBody(post('{"ids":[],"later":1}'), HaveRequest)).toEqual({ ids: [] });
});
