/** Tap to durable: a driven hole from the call to the commit, beside one raw record of the same bytes. */
import { TestServer } from '../e2e/server';
import { makeId } from '../support/people';
import { Browser } from './browser';
import { HOLES } from './holes';
import { atMost, ratioOf, spread, type Row } from './report';

/** @param store a browser with entries in the store of this person, and what its row is called */
export async function tapIn(
	store: {
		readonly browser: Browser;
		readonly url: string;
		readonly person: string;
		readonly build: string;
		readonly name: string;
	},
	taps: number
): Promise<Row> {
	const page = await store.browser.bare(`${store.url}/robots.txt`);
	const { person, build } = store;
	// The first seam only warms up: scripts are compiled, files are open.
	const seams = await page.evaluate(
		([who, where, count]) => tallybarBench.plan(who, where, count),
		[person, build, 1 + Math.ceil(taps / HOLES)] as const
	);
	const run = (some: readonly string[]) =>
		page.evaluate(([who, where, which]) => tallybarBench.taps(who, where, which), [
			person,
			build,
			some
		] as const);
	await run(seams.slice(0, 1));
	const times = await run(seams.slice(1));
	await page.close();
	const [tallybar, floor] = [spread(times.tallybar), spread(times.floor)];
	const ratio = ratioOf(tallybar, floor);
	return {
		name: store.name,
		unit: 'ms',
		tallybar,
		floor,
		ratio,
		goal: atMost(ratio.p95, 1.3, 'p95')
	};
}

/** With nothing in the store but the plan of the seams. */
export async function tapEmpty(taps: number): Promise<Row> {
	const server = await TestServer.start();
	const browser = await Browser.open();
	const [person, build] = [makeId(), makeId()];
	try {
		const page = await browser.bare(`${server.url}/robots.txt`);
		await page.evaluate(
			([who, where]) =>
				tallybarBench.append(who, where, [
					{ id: where, kind: 'build.opened', body: { name: 'Bench' } }
				]),
			[person, build] as const
		);
		await page.close();
		const name = 'tap to durable, empty store';
		return await tapIn({ browser, url: server.url, person, build, name }, taps);
	} finally {
		await browser.close();
		await server.dispose();
	}
}
