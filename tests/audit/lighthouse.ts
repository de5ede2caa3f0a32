/** Lighthouse, as on a phone, on the screens one sees first and most. */
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { chromium } from '@playwright/test';
import lighthouse from 'lighthouse';
import config from '../../playwright.config';
import { freePort } from '../e2e/server';
import { signIn, whole } from './audience';
import type { Account, Filled } from './fill';

/** What is hoped for. */
export const PERFORMANCE = '≥ 90';

export interface Scores {
	readonly name: string;
	/** Of 100, like the others. */
	readonly accessibility: number;
	readonly bestPractices: number;
	readonly performance: number;
	/** What keeps the first two from 100. */
	readonly failing: readonly string[];
}

interface Shown {
	readonly name: string;
	readonly path: string;
	/** Signed in, with the whole log on the device. */
	readonly account?: Account;
}

export async function lighthouseAll(url: string, filled: Filled): Promise<Scores[]> {
	const { build, seam } = filled;
	const account = filled.crew.owner;
	const shown: readonly Shown[] = [
		{ name: 'front page', path: '/' },
		{ name: 'sign in', path: '/sign-in' },
		{ name: 'wall', path: `/builds/${build}/wall`, account },
		{ name: 'bench', path: `/builds/${build}/bench/${seam}`, account },
		{ name: 'logbook', path: `/builds/${build}/logbook`, account }
	];
	const scores: Scores[] = [];
	for (const one of shown) scores.push(await inBrowser(url, one));
	return scores;
}

/** In a browser of its own, so that what one screen left behind does not help the next. */
async function inBrowser(url: string, { name, path, account }: Shown): Promise<Scores> {
	const profile = mkdtempSync(join(tmpdir(), 'tallybar-audit-'));
	const port = await freePort();
	const options = config.use?.launchOptions;
	const context = await chromium.launchPersistentContext(profile, {
		...options,
		args: [...(options?.args ?? []), `--remote-debugging-port=${port}`]
	});
	context.setDefaultTimeout(120_000);
	try {
		if (account) {
			await signIn(context, url, account);
			const page = await context.newPage();
			await whole(page, url);
			await page.evaluate(async () => {
				await navigator.serviceWorker.ready;
			});
			await page.close();
		}
		return { name, ...(await measure(url + path, port)) };
	} finally {
		await context.close();
		rmSync(profile, { recursive: true, force: true });
	}
}

async function measure(address: string, port: number): Promise<Omit<Scores, 'name'>> {
	const ran = await lighthouse(address, {
		port,
		logLevel: 'error',
		onlyCategories: ['accessibility', 'best-practices', 'performance'],
		// Who is signed in and what is on the device are what is measured.
		disableStorageReset: true
	});
	if (!ran) throw new Error(`Lighthouse said nothing of ${address}`);
	const { categories, audits, runtimeError } = ran.lhr;
	if (runtimeError) throw new Error(`${address}: ${runtimeError.message}`);
	const score = (id: string) => Math.round((categories[id]?.score ?? 0) * 100);
	const failing = ['accessibility', 'best-practices']
		.flatMap((id) => categories[id]?.auditRefs ?? [])
		.flatMap(({ id, weight }) => {
			const audit = audits[id];
			return weight > 0 && audit && audit.score !== null && audit.score < 1
				? [`${id}: ${audit.title}`]
				: [];
		});
	return {
		accessibility: score('accessibility'),
		bestPractices: score('best-practices'),
		performance: score('performance'),
		failing
	};
}
