/**
 * The firmware's core as a program that tests drive by its standard input.
 *
 * `read`: each line is a piece of a byte stream in hexadecimal; what each received line says is printed. `fresh` begins another stream.
 * `run`: each line is `tick verb …`, ticks of half a microsecond from the beginning; lines that the controller sends are
 * printed with the tick at which it sends them, steps too if wanted. Verbs, most of them for the time before `start`:
 *   memory HEX · table PLACE PLAY · steps · start CAUSE · bytes HEX · levels N · place N · power N (bytes until it fails) · dump · again (another board)
 */
#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../core/controller.hpp"
#include "../core/request.hpp"
#include "bench.hpp"

namespace {

using core::Order;
using core::Request;

constexpr size_t LONGEST = 1 << 16;
char input[LONGEST];
char bytes[LONGEST / 2];

unsigned fromHex(const char* text, char* to) {
  unsigned length = 0;
  unsigned value;
  while (sscanf(text + 2 * length, "%2x", &value) == 1) {
    to[length] = static_cast<char>(value);
    length += 1;
  }
  return length;
}

const char* codeWord(core::Code code) { return core::nth(core::REFUSAL_WORDS, static_cast<uint8_t>(code)); }

/** What follows the word of an order; empty for most. */
void printFields(const Request& request) {
  if (request.order == Order::stop) printf(" %s", request.free ? "free" : "keep");
  if (request.order == Order::events) printf(" %" PRIu32, request.from);
  if (request.order == Order::home) printf(" %08" PRIX32, request.tag);
  if (request.order == Order::nudge) printf(" %08" PRIX32 " %" PRId32, request.tag, request.place);
  if (request.order == Order::teach)
    printf(" %" PRId32 " %" PRId32 " %" PRIu32 " %" PRIu32 " %" PRIu32, request.place, request.greatest, request.speed,
           request.acceleration, request.home);
  if (request.order != Order::move) return;
  printf(" %08" PRIX32 " %" PRId32 " %" PRIu32 " %" PRIu32, request.tag, request.place, request.speed, request.acceleration);
  if (request.timed)
    printf(" %09" PRIu32 ".%06" PRIu32, request.seconds, request.micros);
  else
    printf(" now");
}

void printLine(const core::Line& line) {
  Request request;
  if (!core::readRequest(line.text, line.length, request)) {
    puts("dropped");
    return;
  }
  printf("%" PRIu32 " %08" PRIX32 " %u ", request.epoch, request.session, request.number);
  if (request.unusable != core::Code::none) {
    printf("refused %s\n", codeWord(request.unusable));
    return;
  }
  printf("%s", core::nth(core::ORDER_WORDS, static_cast<uint8_t>(request.order)));
  printFields(request);
  putchar('\n');
}

int readAll() {
  core::Intake intake;
  intake.clear();
  while (fgets(input, sizeof input, stdin) != nullptr) {
    const bool fresh = strcmp(input, "fresh\n") == 0;
    if (fresh) intake.clear();
    const unsigned length = fresh ? 0 : fromHex(input, bytes);
    for (unsigned index = 0; index < length; index += 1) {
      intake.take(static_cast<uint8_t>(bytes[index]), 0);
      while (intake.ready()) {
        printLine(intake.first());
        intake.release();
      }
    }
    puts(".");
  }
  return 0;
}

hal::BootCause causeOf(const char* text) {
  for (uint8_t index = 0; index < 4; index += 1) {
    if (strcmp(text, core::nth(core::BOOT_WORDS, index)) == 0) return static_cast<hal::BootCause>(index);
  }
  return hal::BootCause::power;
}

void dump() {
  printf("memory %" PRIu32 " ", host::bench.writes);
  for (uint8_t byte : host::bench.memory) printf("%02X", byte);
  putchar('\n');
  printf("table %" PRId32 " drivers %d warning %d\n", host::bench.place, host::bench.driversOn, host::bench.warningOn);
}

void place(const char* rest) {
  int play = host::bench.play;
  sscanf(rest, "%d %d", &host::bench.place, &play);
  host::bench.play = play;
  host::bench.motor = host::bench.place + play;
}

/** One line of a script. */
void obey(const char* verb, const char* rest) {
  if (strcmp(verb, "bytes") == 0) {
    host::arrive(bytes, fromHex(rest, bytes));
  } else if (strcmp(verb, "levels") == 0) {
    host::setLevels(host::withFlag(static_cast<uint8_t>(atoi(rest))));
  } else if (strcmp(verb, "start") == 0) {
    host::bench.levels = host::withFlag(host::bench.levels);
    host::restart(causeOf(rest));
  } else if (strcmp(verb, "table") == 0) {
    place(rest);
  } else if (strcmp(verb, "place") == 0) {
    place(rest);
    host::setLevels(host::withFlag(host::bench.levels));
  } else if (strcmp(verb, "steps") == 0) {
    host::bench.tellSteps = true;
  } else if (strcmp(verb, "memory") == 0) {
    memcpy(host::bench.memory, bytes, fromHex(rest, bytes));
  } else if (strcmp(verb, "power") == 0) {
    host::bench.writesLeft = atoi(rest);
  } else if (strcmp(verb, "dump") == 0) {
    dump();
  }
}

int runAll() {
  host::startBench();
  bool started = false;
  while (fgets(input, sizeof input, stdin) != nullptr) {
    uint64_t tick;
    char verb[16];
    int used = 0;
    if (sscanf(input, "%" SCNu64 " %15s %n", &tick, verb, &used) < 2) continue;
    input[strcspn(input, "\r\n")] = '\0';
    if (strcmp(verb, "again") == 0) {
      puts("again");
      host::startBench();
      started = false;
      continue;
    }
    if (started && tick > host::bench.now) host::runTo(tick);
    started = started || strcmp(verb, "start") == 0;
    obey(verb, input + used);
    if (started) host::runTo(host::bench.now);
  }
  return 0;
}

}  // namespace

int main(int count, char** words) {
  if (count == 2 && strcmp(words[1], "read") == 0) return readAll();
  if (count == 2 && strcmp(words[1], "run") == 0) return runAll();
  fputs("usage: evenfall-host read|run\n", stderr);
  return 2;
}
