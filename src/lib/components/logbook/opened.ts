/** A build that is open on this device: what its pages work with. */
import type { BuildListing } from '$lib/device/read';
import type { DeviceStore } from '$lib/device/store';
import type { BuildLog } from '$lib/device/watch.svelte';
import type { Build } from '$lib/logbook/fold/build';
import { mayWrite } from '$lib/logbook/permission';

export interface OpenedBuild {
	readonly store: DeviceStore;
	readonly log: BuildLog;
	readonly listing: BuildListing;
	/** What concerns no seam, folded. */
	readonly fold: Build;
	readonly self: { readonly person: string; readonly name: string };
}

/** Why this person may not write lines of this kind in this build, in words; undefined when they may. */
export function writeRefusal(
	{ listing }: Pick<OpenedBuild, 'listing'>,
	kind: string
): string | undefined {
	if (listing.removed)
		return 'You are no longer in the crew of this build. What is on this device stays readable.';
	if (listing.role === null)
		return 'The server has not said yet what you do in this build. It stays readable; sync once to write.';
	if (!mayWrite(listing.role, kind))
		return listing.role === 'follower'
			? 'You follow this build. The owner can make you a builder.'
			: 'Your role in this build does not include this.';
	return undefined;
}
