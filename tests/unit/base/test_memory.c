/* Memory: alignment, overflow, the count of bytes, the hooks, and rooms that only grow. */
#include <check.h>
#include <stdlib.h>

#include "base/memory.h"

typedef struct ledger {
    size_t takes, gives, bytes;
    int refuse;
} ledger;

static void *book_allocate(void *user, size_t bytes)
{
    ledger *book = user;
    if (book->refuse)
        return NULL;
    book->takes++;
    book->bytes += bytes;
    return aligned_alloc(64, (bytes + 63) / 64 * 64);
}

static void book_release(void *user, void *memory, size_t bytes)
{
    ledger *book = user;
    book->gives++;
    book->bytes -= bytes;
    free(memory);
}

START_TEST(blocks_are_aligned_and_counted)
{
    rdli_memory memory;
    void *blocks[100];
    ck_assert_int_eq(rdli_memory_init(&memory, NULL), RDL_OK);
    size_t total = 0;
    for (size_t i = 0; i < 100; i++) {
        blocks[i] = rdli_take(&memory, i + 1, 3);
        ck_assert_ptr_nonnull(blocks[i]);
        ck_assert_uint_eq((uintptr_t)blocks[i] % 64, 0);
        memset(blocks[i], 0x77, (i + 1) * 3);
        total += (i + 1) * 3;
    }
    ck_assert_uint_eq(memory.bytes_in_use, total);
    for (size_t i = 0; i < 100; i++)
        rdli_give(&memory, blocks[i], i + 1, 3);
    rdli_give(&memory, NULL, 5, 5);
    ck_assert_uint_eq(memory.bytes_in_use, 0);
}
END_TEST

START_TEST(impossible_sizes_are_refused)
{
    rdli_memory memory;
    rdli_room room = {NULL, 0};
    ck_assert_int_eq(rdli_memory_init(&memory, NULL), RDL_OK);
    ck_assert_ptr_null(rdli_take(&memory, 0, 8));
    ck_assert_ptr_null(rdli_take(&memory, 8, 0));
    ck_assert_ptr_null(rdli_take(&memory, SIZE_MAX / 4, 8));
    ck_assert_ptr_null(rdli_take(&memory, SIZE_MAX, 1));
    ck_assert(!rdli_room_reserve(&memory, &room, SIZE_MAX / 4, 8, false));
    ck_assert_ptr_null(room.data);
    ck_assert_uint_eq(memory.bytes_in_use, 0);
}
END_TEST

START_TEST(one_hook_without_the_other_is_refused)
{
    rdli_memory memory;
    rdl_host host = {.size = sizeof host, .allocate = book_allocate};
    ck_assert_int_eq(rdli_memory_init(&memory, &host), RDL_BAD_ARGUMENT);
    host.allocate = NULL;
    host.release = book_release;
    ck_assert_int_eq(rdli_memory_init(&memory, &host), RDL_BAD_ARGUMENT);
}
END_TEST

START_TEST(the_hooks_get_the_same_byte_count_back)
{
    ledger book = {0, 0, 0, 0};
    rdl_host host = {.size = sizeof host, .user = &book, .allocate = book_allocate, .release = book_release};
    rdli_memory memory;
    rdli_room room = {NULL, 0};
    ck_assert_int_eq(rdli_memory_init(&memory, &host), RDL_OK);
    void *block = rdli_take(&memory, 7, 9);
    ck_assert_uint_eq(book.bytes, 63);
    ck_assert(rdli_room_reserve(&memory, &room, 10, 10, true));
    ck_assert(rdli_room_reserve(&memory, &room, 1000, 10, true));
    ck_assert_uint_eq(book.bytes, memory.bytes_in_use);
    rdli_room_release(&memory, &room);
    rdli_give(&memory, block, 7, 9);
    ck_assert_uint_eq(book.takes, 3);
    ck_assert_uint_eq(book.gives, 3);
    ck_assert_uint_eq(book.bytes, 0);
}
END_TEST

START_TEST(rooms_keep_contents_and_only_grow)
{
    ledger book = {0, 0, 0, 0};
    rdl_host host = {.size = sizeof host, .user = &book, .allocate = book_allocate, .release = book_release};
    rdli_memory memory;
    rdli_room room = {NULL, 0};
    ck_assert_int_eq(rdli_memory_init(&memory, &host), RDL_OK);
    ck_assert(rdli_room_reserve(&memory, &room, 0, sizeof(uint32_t), true));
    for (uint32_t i = 0; i < 10000; i++) {
        ck_assert(rdli_room_reserve(&memory, &room, i + 1, sizeof i, true));
        ((uint32_t *)room.data)[i] = i;
    }
    for (uint32_t i = 0; i < 10000; i++)
        ck_assert_uint_eq(((const uint32_t *)room.data)[i], i);
    ck_assert_uint_lt(book.takes, 40); /* growth by half: logarithmic in the size */
    size_t takes = book.takes, bytes = room.bytes;
    ck_assert(rdli_room_reserve(&memory, &room, 1, 1, false));
    ck_assert_uint_eq(room.bytes, bytes);
    ck_assert_uint_eq(book.takes, takes);
    rdli_room_release(&memory, &room);
    rdli_room_release(&memory, &room);
    ck_assert_uint_eq(book.bytes, 0);
}
END_TEST

START_TEST(a_refused_growth_leaves_the_room_as_it_was)
{
    ledger book = {0, 0, 0, 0};
    rdl_host host = {.size = sizeof host, .user = &book, .allocate = book_allocate, .release = book_release};
    rdli_memory memory;
    rdli_room room = {NULL, 0};
    ck_assert_int_eq(rdli_memory_init(&memory, &host), RDL_OK);
    ck_assert(rdli_room_reserve(&memory, &room, 64, 1, false));
    memset(room.data, 0x33, 64);
    rdli_room before = room;
    book.refuse = 1;
    ck_assert(!rdli_room_reserve(&memory, &room, 4096, 1, true));
    ck_assert_ptr_eq(room.data, before.data);
    ck_assert_uint_eq(room.bytes, before.bytes);
    ck_assert_uint_eq(((const unsigned char *)room.data)[63], 0x33);
    rdli_room_release(&memory, &room);
    ck_assert_uint_eq(book.bytes, 0);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("memory");
    TCase *group = tcase_create("memory");
    tcase_add_test(group, blocks_are_aligned_and_counted);
    tcase_add_test(group, impossible_sizes_are_refused);
    tcase_add_test(group, one_hook_without_the_other_is_refused);
    tcase_add_test(group, the_hooks_get_the_same_byte_count_back);
    tcase_add_test(group, rooms_keep_contents_and_only_grow);
    tcase_add_test(group, a_refused_growth_leaves_the_room_as_it_was);
    suite_add_tcase(suite, group);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
