import { test as base } from '@playwright/test';
import { Audience } from '../audit/audience';
import { loadFill } from '../audit/load';
import { TestServer } from './server';

/** Enough for every list to have something in it; a longer one has the same faults and takes longer. */
const SIZE = { entries: 250, seams: 12 };

/** `test` with all screens of a filled server, opened once for a whole file. */
export const test = base.extend<object, { audience: Audience }>({
	audience: [
		async ({ browser }, use) => {
			const server = await TestServer.start();
			const { fill } = await loadFill();
			const filled = await fill(server, SIZE);
			const audience = await Audience.open(browser, server.url, filled, 'owner');
			await use(audience);
			await audience.close();
			await server.dispose();
		},
		{ scope: 'worker', timeout: 300_000 }
	]
});

export { expect } from '@playwright/test';
