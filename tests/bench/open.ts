/** Opening the bench of a seam offline, from the service worker and a store full of entries. */
import type { Page } from '@playwright/test';
import type { Browser } from './browser';
import { ratioOf, spread, type Row } from './report';

export interface Full {
	readonly browser: Browser;
	readonly url: string;
	readonly person: string;
	readonly build: string;
	readonly entries: number;
}

/** The row of holes with a hole in it. */
const ROW = '[role=group][aria-label="Holes of the seam"] :is(button, [role=img])';
/** A page of the shop with nothing in it but the frame. */
const FLOOR = 'h1';

/**
 * Lets the service worker take hold of a browser while there is a network.
 * @returns the scripts and styles the first visit of the bench loaded
 */
export async function visit({ browser, url, build }: Full, seam: string): Promise<string[]> {
	const page = await browser.context.newPage();
	await page.goto(`${url}/builds/${build}/bench/${seam}`);
	await page.locator(ROW).first().waitFor();
	const loaded = await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
		return performance
			.getEntriesByType('resource')
			.map(({ name }) => new URL(name).pathname)
			.filter((path) => /\.(js|css)$/.test(path) && path.startsWith('/_app/'));
	});
	await page.close();
	return [...new Set(loaded)];
}

/** Which seam is opened: the one with the most lines among those still worked on. */
export async function seamToOpen({ browser, url, person, build }: Full): Promise<string> {
	const page = await browser.bare(`${url}/robots.txt`);
	const seam = await page.evaluate(([who, where]) => tallybarBench.busiestSeam(who, where), [
		person,
		build
	] as const);
	await page.close();
	return seam;
}

/** @param full visited before, its server stopped */
export async function openOffline(full: Full, seam: string, times: number): Promise<Row> {
	const { browser, url, build, entries } = full;
	const tallybar: number[] = [];
	const floor: number[] = [];
	// The first of each warms up the browser, not the page.
	for (let i = -1; i < times; i++) {
		const bench = await shown(browser, `${url}/builds/${build}/bench/${seam}`, ROW);
		const empty = await shown(browser, `${url}/builds`, FLOOR);
		if (i < 0) continue;
		tallybar.push(bench);
		floor.push(empty);
	}
	const [ours, theirs] = [spread(tallybar), spread(floor)];
	return {
		name: `open the bench offline, ${entries.toLocaleString('en')} entries`,
		unit: 'ms',
		tallybar: ours,
		floor: theirs,
		ratio: ratioOf(ours, theirs),
		note: 'From the start of the navigation to the row of holes painted, in a new page; floor: the same to the heading of /builds.'
	};
}

/** Ms from the start of the navigation until this is in the page and painted. */
async function shown(browser: Browser, url: string, selector: string): Promise<number> {
	const page = await browser.context.newPage();
	try {
		await page.addInitScript(watchFor, selector);
		await page.goto(url, { waitUntil: 'commit' });
		const painted = await page.waitForFunction(() => globalThis.shownAt);
		return await painted.evaluate((at) => at ?? Number.NaN);
	} finally {
		await page.close();
	}
}

declare global {
	var shownAt: number | undefined;
}

function watchFor(selector: string): void {
	const look = () => {
		if (document.querySelector(selector) === null) return;
		observer.disconnect();
		requestAnimationFrame(() => {
			// A task after the frame: what it drew has been handed on.
			setTimeout(() => {
				globalThis.shownAt = performance.now();
			});
		});
	};
	const observer = new MutationObserver(look);
	observer.observe(document, { childList: true, subtree: true });
}

/** What the bench reads, from a store nothing of which is in memory yet; beside the same rows read raw. */
export async function readCold(full: Full, seam: string, times: number): Promise<Row> {
	const { browser, url, person, build, entries } = full;
	const tallybar: number[] = [];
	const floor: number[] = [];
	let what = '';
	const inNewPage = async <T>(work: (page: Page) => Promise<T>): Promise<T> => {
		const page = await browser.bare(`${url}/robots.txt`);
		try {
			return await work(page);
		} finally {
			await page.close();
		}
	};
	for (let i = -1; i < times; i++) {
		const ours = await inNewPage((page) =>
			page.evaluate(([who, where, which]) => tallybarBench.coldRead(who, where, which), [
				person,
				build,
				seam
			] as const)
		);
		const theirs = await inNewPage((page) =>
			page.evaluate(([who, where, which]) => tallybarBench.coldReadRaw(who, where, which), [
				person,
				build,
				seam
			] as const)
		);
		what = `${ours.lines} lines of the seam folded, ${ours.seams} summaries read.`;
		if (i < 0) continue;
		tallybar.push(ours.ms);
		floor.push(theirs);
	}
	const [ours, theirs] = [spread(tallybar), spread(floor)];
	return {
		name: `seam and summaries from a cold store, ${entries.toLocaleString('en')} entries`,
		unit: 'ms',
		tallybar: ours,
		floor: theirs,
		ratio: ratioOf(ours, theirs),
		note: what
	};
}
