#include "protocol.hpp"

namespace core {

const char ORDER_WORDS[] FLASH = "ident\0hello\0status\0renew\0limits\0events\0home\0move\0hold\0stop\0off\0nudge\0teach\0";
const char STATE_WORDS[] FLASH = "rest\0waiting\0moving\0homing\0braking\0fault\0";
const char EVENT_WORDS[] FLASH = "boot\0warn\0began\0ended\0homed\0edge\0interlock\0supply\0key\0lease\0limit\0";
const char CAUSE_WORDS[] FLASH = "done\0hold\0stop\0off\0interlock\0supply\0lease\0limit\0session\0search\0fault\0";
const char REFUSAL_WORDS[] FLASH =
    "none\0word\0field\0epoch\0session\0old\0reused\0repeat\0busy\0stopped\0key\0lease\0interlock\0supply\0unknown\0travel\0speed\0ramp\0"
    "past\0far\0warning\0flag\0gone\0fault\0";
const char BOOT_WORDS[] FLASH = "power\0button\0brownout\0watchdog\0";
const char LEVEL_WORDS[] FLASH = "cw\0ccw\0open\0closed\0lost\0present\0off\0on\0";
const char FIRMWARE[] FLASH = "evenfall-1.0";

const char* nth(const char* words, uint8_t index) {
  while (index != 0) {
    while (hal::flashByte(words) != '\0') words += 1;
    words += 1;
    index -= 1;
  }
  return words;
}

}  // namespace core
