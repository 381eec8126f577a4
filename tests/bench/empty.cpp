// SPDX-License-Identifier: Apache-2.0
// A program that does nothing: what starting a process costs by itself, the peer of start_up_bench.
int main() {
    return 0;
}
