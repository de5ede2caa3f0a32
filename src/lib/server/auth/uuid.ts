import { randomBytes } from 'node:crypto';

/** A UUID v7 (RFC 9562): 48 bits of milliseconds, then random bits. Lower case, as entries have them. */
export function uuidV7(now: number = Date.now()): string {
	const bytes = randomBytes(16);
	bytes.writeUIntBE(now, 0, 6);
	bytes.writeUInt8((bytes.readUInt8(6) & 0x0f) | 0x70, 6);
	bytes.writeUInt8((bytes.readUInt8(8) & 0x3f) | 0x80, 8);
	return bytes.toString('hex').replace(/^(.{8})(.{4})(.{4})(.{4})(.{12})$/, '$1-$2-$3-$4-$5');
}
