import { describe, expect, it } from 'vitest';
import { nextPage, signInPage } from './next-page';

describe('the page after signing in', () => {
	it.each(['/account', '/builds/0189/bench?row=2#hole-31', '/builds/a%2Fb'])(
		'is the one of ours that was asked for: %s',
		(path) => {
			expect(nextPage(path)).toBe(path);
		}
	);

	it.each([
		null,
		'',
		'builds',
		'https://evil.test/',
		'//evil.test/',
		'/\\evil.test/',
		'/\t/evil.test/',
		'/\n/evil.test',
		'/.//evil.test',
		'/a/..//evil.test',
		'\\\\evil.test',
		'javascript:alert(1)',
		'/sign-in?next=/account',
		'/sign-out',
		'/register',
		'/api/session'
	])('is the builds for anything else: %j', (asked) => {
		expect(nextPage(asked)).toBe('/builds');
	});

	it('survives the way through the address of the sign-in page', () => {
		const from = new URL('http://localhost/builds/1/bench?row=2&side=left');
		const there = new URL(signInPage(from), from);
		expect(there.pathname).toBe('/sign-in');
		expect(nextPage(there.searchParams.get('next'))).toBe('/builds/1/bench?row=2&side=left');
	});
});
