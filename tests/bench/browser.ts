/** Real Chromium with a profile on the disk, and the device code in a bare page of it. */
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { chromium } from '@playwright/test';
import type { BrowserContext, Page } from '@playwright/test';
import { build } from 'vite';
import config from '../../playwright.config';
import { ROOT } from '../../src/bin/prepare.js';

/**
 * A browser of its own. Always with a profile: in a private window Chromium keeps IndexedDB in memory, and "durable"
 * would cost nothing.
 */
export class Browser {
	readonly profile: string;
	readonly context: BrowserContext;

	private constructor(profile: string, context: BrowserContext) {
		this.profile = profile;
		this.context = context;
	}

	static async open(profile = mkdtempSync(join(tmpdir(), 'tallybar-profile-'))): Promise<Browser> {
		return new Browser(
			profile,
			await chromium.launchPersistentContext(profile, config.use?.launchOptions ?? {})
		);
	}

	/** Signed in at a server by the cookie of a caller, `name=value`. */
	async signIn(url: string, cookie: string): Promise<void> {
		const [name = '', value = ''] = cookie.split('=', 2);
		await this.context.addCookies([{ name, value, url }]);
	}

	/** A page of this origin that runs nothing but what the bench asks of `tallybarBench`. */
	async bare(url: string): Promise<Page> {
		const page = await this.context.newPage();
		await page.goto(url);
		await page.evaluate(await script());
		return page;
	}

	async close({ keep = false } = {}): Promise<void> {
		await this.context.close();
		if (!keep) rmSync(this.profile, { recursive: true, force: true });
	}
}

let bundled: Promise<string> | undefined;

/** `page.ts` as one script, minified like the app. */
function script(): Promise<string> {
	return (bundled ??= bundle());
}

async function bundle(): Promise<string> {
	const output = await build({
		configFile: false,
		root: ROOT,
		logLevel: 'error',
		publicDir: false,
		resolve: { alias: { $lib: join(ROOT, 'src/lib') } },
		build: {
			write: false,
			minify: true,
			lib: {
				entry: join(ROOT, 'tests/bench/page.ts'),
				formats: ['iife'],
				name: 'tallybarBench'
			}
		}
	});
	const [first] = Array.isArray(output) ? output : [output];
	if (!('output' in first)) throw new Error('the page of the bench was not built');
	return `${first.output[0].code};undefined`;
}
