/** Sessions, at-most-once and the epoch fence (SPEC 3). */
#pragma once
#include "intake.hpp"
#include "request.hpp"

namespace core {
namespace session {

enum class Admission : uint8_t { fresh, repetition, refused };

void start();
/** SPEC 3.2, 3.3. The new session, 0 when the epoch is too low. */
uint32_t open(uint32_t epoch);
/** SPEC 3.4 and 3.6. `code` and `detail` when refused, which changes nothing (SPEC 3.7). */
Admission admit(const Request& request, const char* text, uint8_t length, Code& code, uint32_t& detail);
/** Whether it is the last request once more, byte for byte. */
bool isRepetition(const Request& request, const char* text, uint8_t length);
/** Remembers a request that was carried out and its reply; a stop from elsewhere or with an old number leaves no trace (SPEC 9.4). */
void keep(const Request& request, const char* text, uint8_t length, const char* reply, uint8_t replyLength);
const char* storedReply();
uint8_t storedLength();

}  // namespace session
}  // namespace core
