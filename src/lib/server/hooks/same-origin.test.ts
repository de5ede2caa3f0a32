import { describe, expect, it } from 'vitest';
import { isSameOrigin } from './same-origin';

const OURS = 'https://log.example.org';

describe('an unsafe request', () => {
	it.each([
		[{ origin: OURS }, true],
		[{ origin: OURS, 'sec-fetch-site': 'same-origin' }, true],
		[{ 'sec-fetch-site': 'same-origin' }, true],
		[{}, false],
		[{ origin: 'null' }, false],
		[{ origin: '' }, false],
		[{ origin: 'http://log.example.org' }, false],
		[{ origin: `${OURS}:8443` }, false],
		[{ origin: `${OURS}.evil.test` }, false],
		[{ origin: 'https://shop.example.org', 'sec-fetch-site': 'same-site' }, false],
		// The two never disagree in a browser; where they do, the stricter holds.
		[{ origin: 'https://evil.test', 'sec-fetch-site': 'same-origin' }, false],
		[{ 'sec-fetch-site': 'same-site' }, false],
		[{ 'sec-fetch-site': 'none' }, false],
		[{ 'sec-fetch-site': 'cross-site' }, false],
		[{ host: 'log.example.org', referer: `${OURS}/` }, false]
	])('with %j comes from our own page: %s', (headers, ours) => {
		expect(isSameOrigin(new Headers(headers as Record<string, string>), OURS)).toBe(ours);
	});
});
