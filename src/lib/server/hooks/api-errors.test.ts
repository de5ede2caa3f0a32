import { error, json } from '@sveltejs/kit';
import type { RequestEvent } from '@sveltejs/kit';
import { describe, expect, it } from 'vitest';
import { DiskFullError } from '../write';
import { apiErrors, failureCode } from './api-errors';

const locals = (failure?: App.Locals['failure']): App.Locals => ({
	requestId: 'r1',
	person: null,
	session: null,
	...(failure !== undefined && { failure })
});

async function answerTo(
	resolve: () => Response | Promise<Response>,
	path = '/api/builds',
	failure?: App.Locals['failure']
): Promise<Response> {
	const event = {
		url: new URL(`http://localhost${path}`),
		route: { id: path },
		locals: locals(failure)
	} as unknown as RequestEvent;
	return apiErrors({ event, resolve: async () => resolve() });
}

const page = (status: number) =>
	new Response('<h1>stack at /srv/app.js:1</h1>', {
		status,
		headers: { 'content-type': 'text/html' }
	});

describe('an error under /api', () => {
	it.each([
		[404, 'request.no_such_page'],
		[405, 'request.no_such_page'],
		[413, 'request.too_large'],
		[415, 'request.malformed'],
		[500, 'request.internal'],
		[503, 'request.unavailable']
	])('that SvelteKit answers with a page and %i is said in our own words', async (status, code) => {
		const response = await answerTo(() => page(status));
		expect(response.status).toBe(status);
		const body: unknown = await response.json();
		expect(body).toMatchObject({ code, requestId: 'r1' });
		expect(JSON.stringify(body)).not.toContain('srv');
	});

	it('that handleError has seen keeps its reason and its status', async () => {
		const response = await answerTo(() => page(500), '/api/builds', 'disk.full');
		expect(response.status).toBe(507);
		expect(await response.json()).toMatchObject({ code: 'disk.full' });
	});

	it('that was thrown before a route was reached is one too', async () => {
		const response = await answerTo(() => Promise.reject(new Error('secret path')));
		expect(response.status).toBe(500);
		expect(await response.text()).not.toContain('secret');
		expect((await answerTo(() => error(404))).status).toBe(404);
	});

	it('that a route gave itself goes out as it is', async () => {
		const ours = json({ code: 'build.unknown', says: 'as it is' }, { status: 404 });
		expect(await answerTo(() => ours)).toBe(ours);
	});

	it('concerns no page, and no answer that is none', async () => {
		const broken = page(500);
		expect(await answerTo(() => broken, '/account')).toBe(broken);
		const fine = json({});
		expect(await answerTo(() => fine)).toBe(fine);
	});
});

describe('the reason of a failure', () => {
	it('is told apart by what the phone should do', () => {
		expect(failureCode(new DiskFullError('full'))).toBe('disk.full');
		expect(failureCode(Object.assign(new Error('x'), { code: 'SQLITE_FULL' }))).toBe('disk.full');
		expect(failureCode(Object.assign(new Error('x'), { code: 'SQLITE_BUSY' }))).toBe(
			'request.unavailable'
		);
		expect(failureCode(new TypeError('x'))).toBe('request.internal');
		expect(failureCode('thrown text')).toBe('request.internal');
	});
});
