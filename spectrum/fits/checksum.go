package fits

import (
	"encoding/binary"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// CheckSums compares the HDU with the sums that its writer left in CHECKSUM and
// DATASUM, and says which one does not hold; "" where both do or neither is
// there. It reads the whole HDU. Source: FITS Standard 4.0, appendix J.
func (h *HDU) CheckSums() (string, error) {
	check, data := h.Str("CHECKSUM"), h.Str("DATASUM")
	if check == "" && data == "" {
		return "", nil
	}
	sum, err := onesSum(io.NewSectionReader(h.r, h.data, h.size+(block-h.size%block)%block))
	if err != nil {
		return "", fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
	}
	if want, err := strconv.ParseUint(data, 10, 32); data != "" && (err != nil || uint32(want) != sum) {
		return fmt.Sprintf("DATASUM = '%s', but the data add up to %d", data, sum), nil
	}
	if check == "" || strings.Trim(check, "0") == "" { // zeros: not computed
		return "", nil
	}
	head, err := onesSum(io.NewSectionReader(h.r, h.start, h.data-h.start))
	if err != nil {
		return "", fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
	}
	if total := onesAdd(head, sum); total != 0xffffffff && total != 0 {
		return "CHECKSUM does not hold", nil
	}
	return "", nil
}

// onesSum adds 32-bit words in ones' complement; the last one is filled with zeros.
func onesSum(r io.Reader) (uint32, error) {
	var sum uint32
	buf := make([]byte, 1<<16)
	for {
		n, err := io.ReadFull(r, buf)
		for i := n; i < len(buf) && i%4 != 0; i++ {
			buf[i] = 0
			n = i + 1
		}
		for i := 0; i+4 <= n; i += 4 {
			sum = onesAdd(sum, binary.BigEndian.Uint32(buf[i:]))
		}
		switch err {
		case nil:
		case io.EOF, io.ErrUnexpectedEOF:
			return sum, nil
		default:
			return 0, err
		}
	}
}

func onesAdd(a, b uint32) uint32 {
	s := uint64(a) + uint64(b)
	return uint32(s) + uint32(s>>32)
}
