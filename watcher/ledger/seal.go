package ledger

import (
	"encoding/binary"
	"hash/crc32"
)

// sealSize is the length of the checksum that every value begins with.
const sealSize = 4

var castagnoli = crc32.MakeTable(crc32.Castagnoli)

// seeds holds the checksum of each bucket's name, so that a value that strays into another bucket is seen.
var seeds = func() (s [buckets]uint32) {
	for b := range s {
		s[b] = crc32.Checksum([]byte(bucketNames[b]), castagnoli)
	}
	return s
}()

// checksum is the CRC-32C of bucket name, key and value without its first four bytes.
func checksum(b bucket, key, value []byte) uint32 {
	return crc32.Update(crc32.Update(seeds[b], castagnoli, key), castagnoli, value[sealSize:])
}

// seal writes the checksum into the first four bytes of a value and returns it.
func seal(b bucket, key, value []byte) uint32 {
	sum := checksum(b, key, value)
	binary.LittleEndian.PutUint32(value, sum)
	return sum
}

// opened checks the seal of a value and returns what follows it.
func opened(b bucket, key, value []byte) ([]byte, error) {
	if len(value) < sealSize || checksum(b, key, value) != binary.LittleEndian.Uint32(value) {
		return nil, &Damaged{Where: place(b, key), Why: "checksum does not match"}
	}
	return value[sealSize:], nil
}

// malformed is the error for a value whose checksum holds and whose content makes no sense.
func malformed(b bucket, key []byte, why string) error {
	return &Damaged{Where: place(b, key), Why: why}
}
