import type { Browser, BrowserContext, Page } from '@playwright/test';
import type { Role } from '../../src/lib/logbook/kinds';
import type { Account, Filled } from './fill';
import { SCREENS, type Screen } from './screens';

const PHONE = { width: 412, height: 823 };

/** Who looks at the screens: nobody, somebody new, and one of the crew, each with a browser of their own. */
export class Audience {
	readonly url: string;
	readonly filled: Filled;
	readonly role: Role;
	readonly #pages: Readonly<Record<Screen['who'], Page>>;

	private constructor(
		url: string,
		filled: Filled,
		role: Role,
		pages: Readonly<Record<Screen['who'], Page>>
	) {
		this.url = url;
		this.filled = filled;
		this.role = role;
		this.#pages = pages;
	}

	/** Resolves when the one of the crew has the whole log. */
	static async open(browser: Browser, url: string, filled: Filled, role: Role): Promise<Audience> {
		const pageOf = async (account?: Account) => {
			const context = await browser.newContext({ viewport: PHONE });
			// A busy machine is no fault of a screen.
			context.setDefaultTimeout(120_000);
			if (account) await signIn(context, url, account);
			return context.newPage();
		};
		const pages = {
			nobody: await pageOf(),
			newcomer: await pageOf(filled.newcomer),
			crew: await pageOf(filled.crew[role])
		};
		await whole(pages.crew, url);
		return new Audience(url, filled, role, pages);
	}

	/** The screens this audience has, in their order. */
	get screens(): readonly Screen[] {
		return SCREENS.filter(({ roles }) => roles === undefined || roles.includes(this.role));
	}

	/** Goes to a screen on a phone, unless already at its address, and waits until it is shown. */
	async at(screen: Screen): Promise<Page> {
		const page = this.#pages[screen.who];
		await page.setViewportSize(PHONE);
		const address = this.url + screen.path(this.filled);
		if (page.url() !== address || screen.act === undefined) await page.goto(address);
		const sheet = page.getByRole('dialog');
		if (await sheet.isVisible()) {
			await sheet.getByRole('button', { name: 'close', exact: true }).click();
			await sheet.waitFor({ state: 'hidden' });
		}
		await screen.act?.(page);
		await screen.shows(page).waitFor();
		return page;
	}

	/** Does something while none of them has a network; the app is on their devices. */
	async withoutNetwork(work: () => Promise<void>): Promise<void> {
		const pages = Object.values(this.#pages);
		try {
			for (const page of pages) {
				await page.goto(`${this.url}/builds`);
				await page.evaluate(async () => {
					await navigator.serviceWorker.ready;
				});
				await page.context().setOffline(true);
			}
			await work();
		} finally {
			for (const page of pages) await page.context().setOffline(false);
		}
	}

	async close(): Promise<void> {
		for (const page of Object.values(this.#pages)) await page.context().close();
	}
}

export async function signIn(
	context: BrowserContext,
	url: string,
	{ cookie }: Account
): Promise<void> {
	const [name = '', value = ''] = cookie.split('=', 2);
	await context.addCookies([{ name, value, url }]);
}

/** Resolves when everything the server has is on this device. */
export async function whole(page: Page, url: string): Promise<void> {
	await page.goto(`${url}/sync`);
	await page.getByRole('link', { name: /^Sync: synced/ }).waitFor();
}
