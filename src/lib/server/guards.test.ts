import { readdirSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { guardOf, GUARDS } from './guards';

/** What makes a folder an address: a page, or an endpoint. */
const ROUTE = /(?:^|\/)\+(?:page(?:\.server)?|server)\.(?:svelte|[jt]s)$/;

function routeIds(): string[] {
	const files = readdirSync('src/routes', { recursive: true, encoding: 'utf8' });
	const ids = files
		.map((file) => file.replaceAll('\\', '/'))
		.filter((file) => ROUTE.test(file))
		.map((file) => `/${file.replace(ROUTE, '')}`);
	return [...new Set(ids)].sort();
}

describe('the table of guards', () => {
	it('lists every route there is, and no other', () => {
		expect(Object.keys(GUARDS).sort()).toEqual(routeIds());
	});

	it('opens to everybody nothing under /api but the question who asks', () => {
		const open = Object.entries(GUARDS).filter(([, guard]) => guard === 'public');
		expect(open.map(([id]) => id).filter((id) => id.startsWith('/api'))).toEqual(['/api/session']);
	});

	it('knows nothing of a route that is not listed, whatever its name', () => {
		for (const id of ['/api/unlisted', 'constructor', '__proto__', 'toString', '']) {
			expect(guardOf(id)).toBeUndefined();
		}
	});
});
