/**
 * What every page stands on. That of the shop is provided by the layout of (shop), so pages never open anything themselves; a
 * page is made anew when the person or the build changes, so what these answer stays the same for its whole life.
 */
import { createContext } from 'svelte';
import type { Session } from '$lib/device/session.svelte';
import type { DeviceStore } from '$lib/device/store';
import type { BuildLog, SyncStatus } from '$lib/device/watch.svelte';
import type { Running } from './running';

/** What runs in this tab. On every page. */
export const [getRunning, provideRunning] = createContext<Running>();

/** Who logs here. On every page of the shop. */
export const [getSession, provideSession] = createContext<Session>();

export interface Shop {
	readonly store: DeviceStore;
	/** How sync stands. */
	readonly sync: SyncStatus;
	/** The build of the address; undefined outside of one. */
	readonly build: BuildLog | undefined;
}

/** The open store and its sync. A page is only drawn while there is one. */
export const [getShop, provideShop] = createContext<Shop>();

/** The build of the address, for pages under /builds/[build]. */
export function getBuild(): BuildLog {
	const { build } = getShop();
	if (!build) throw new Error('no build in this address');
	return build;
}
