/** The device's clock and chance, in one place so that tests may set them. */
import type { Chance } from '$lib/logbook/id';

export interface DeviceEnv {
	/** Milliseconds since 1970, as this device believes. */
	now: () => number;
	/** Minutes to add to UTC for the wall clock at that time. */
	offset: (ms: number) => number;
	chance: Chance;
}

export const DEVICE: DeviceEnv = {
	now: () => Date.now(),
	offset: (ms) => -new Date(ms).getTimezoneOffset(),
	chance: (bytes) => crypto.getRandomValues(bytes)
};

/** Wall time with offset and milliseconds, as entries have it: `2026-12-01T21:40:05.120+01:00`. */
export function wallTime({ now, offset }: DeviceEnv): string {
	const ms = Math.min(Math.max(Math.trunc(now()), 0), 253_402_000_000_000);
	const minutes = Math.trunc(offset(ms));
	const local = new Date(ms + minutes * 60_000).toISOString().slice(0, 23);
	const two = (value: number) => String(value).padStart(2, '0');
	const size = Math.abs(minutes);
	return `${local}${minutes < 0 ? '-' : '+'}${two(Math.trunc(size / 60))}:${two(size % 60)}`;
}
